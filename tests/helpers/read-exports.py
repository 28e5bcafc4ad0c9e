"""Reads exported files with tools that are not ours and prints what they hold as JSON: numpy for .npy, the XML
parser and base64 of Python's library for VTK."""
import base64
import json
import struct
import sys
import xml.etree.ElementTree as ElementTree

CODES = {"Int32": "i", "Int64": "q", "Float32": "f", "Float64": "d"}


def plain(value):
    return None if value != value else value


def read_npy(path):
    import numpy

    data = numpy.load(path, allow_pickle=False)
    columns = {name: [plain(v) for v in data[name].ravel().tolist()] for name in data.dtype.names}
    return {"shape": list(data.shape), "types": [data.dtype[n].str for n in data.dtype.names], "columns": columns}


def read_vtk(path):
    root = ElementTree.parse(path).getroot()
    kind = root.attrib["type"]
    body = root.find(kind)
    piece = body.find("Piece")
    arrays = {}
    for array in piece.iter("DataArray"):
        raw = base64.b64decode("".join(array.text.split()), validate=True)
        (size,) = struct.unpack_from("<Q", raw)
        assert size == len(raw) - 8, array.attrib
        code = CODES[array.attrib["type"]]
        values = struct.unpack("<%d%s" % (size // struct.calcsize(code), code), raw[8:])
        components = int(array.attrib.get("NumberOfComponents", "1"))
        arrays[array.attrib["Name"]] = {"components": components, "values": [plain(v) for v in values]}
    return {"root": root.attrib, "kind": kind, "body": body.attrib, "piece": piece.attrib, "arrays": arrays}


print(json.dumps(read_npy(sys.argv[1]) if sys.argv[1].endswith(".npy") else read_vtk(sys.argv[1])))
