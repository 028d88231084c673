"""``.h5`` files. See :mod:`harness`."""

from harness import fuzz_format, written_files

if __name__ == "__main__":
    fuzz_format("input.h5", lambda folder: written_files(folder, ".h5"))
