"""Exodus files, classic and on HDF5. See :mod:`harness`."""

from harness import fuzz_format


def seeds(folder):
    from tests.loaders.test_exodus_files import full

    for flavour in ("NETCDF3_CLASSIC", "NETCDF3_64BIT_OFFSET", "NETCDF4"):
        yield full(folder / "seed.exo", flavour).read_bytes()


if __name__ == "__main__":
    fuzz_format("input.exo", seeds)
