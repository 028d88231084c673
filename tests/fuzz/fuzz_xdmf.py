"""``.xdmf`` files with their numbers in the XML. See :mod:`harness`."""

from harness import fuzz_format

_POINTS = '<DataItem Dimensions="4 3" Precision="8">0 0 0 1 0 0 0 1 0 0 0 1</DataItem>'
_U = '<Attribute Name="u" Center="Node" AttributeType="Vector">' + _POINTS + "</Attribute>"
_INCLUDE = (
    '<xi:include xmlns:xi="http://www.w3.org/2001/XInclude" '
    "xpointer='xpointer(//Grid[@Name=\"m\"]/*[self::Topology or self::Geometry])'/>"
)


def _grid(topology, cells, shape, inner=""):
    return (
        f'<Grid Name="m"><Topology TopologyType="{topology}"><DataItem NumberType="Int" Dimensions="{shape}">{cells}'
        f'</DataItem></Topology><Geometry GeometryType="XYZ">{_POINTS}</Geometry>{inner}</Grid>'
    )


def _file(*grids):
    return ('<?xml version="1.0"?><Xdmf><Domain>' + "".join(grids) + "</Domain></Xdmf>").encode()


def seeds(folder):
    sets = '<Set Name="s" SetType="Node"><DataItem NumberType="UInt" Dimensions="2">0 3</DataItem></Set>'
    yield _file(_grid("Tetrahedron", "0 1 2 3", "1 4", _U.replace('"u"', '"mode_001"') + sets))
    yield _file(_grid("Mixed", "6 0 1 2 3 4 0 1 2 2 2 0 1", "13"))
    steps = "".join(
        f'<Grid>{_INCLUDE}<Time Value="{n}.5"/><Information Name="freq_hz" Value="{n}"/>{_U}</Grid>' for n in (3, 3)
    )
    yield _file(
        _grid("Triangle", "0 1 2", "1 3"), f'<Grid GridType="Collection" CollectionType="Temporal">{steps}</Grid>'
    )
    named = '<DataItem Name="p" ' + _POINTS.removeprefix("<DataItem ")
    reference = '<DataItem Reference="/Xdmf/Domain/DataItem[1]"/>'
    yield _file(named, _grid("Triangle", "0 1 2", "1 3").replace(_POINTS, reference))


if __name__ == "__main__":
    fuzz_format("input.xdmf", seeds)
