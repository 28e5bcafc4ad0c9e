"""Links of a pathlines.nc against the true particle of each row of the dump.

usage: check-links.py PATHLINES_NC PARTICLES_I32 FRAMES_I32
Prints JSON: links made, right, true ones (successive detections of a particle at most three frames apart).
"""

import json
import sys

import netCDF4
import numpy as np

REACH_FRAMES = 3

with netCDF4.Dataset(sys.argv[1]) as file:
    detection = np.asarray(file["detection"][:])
    size = np.asarray(file["row_size"][:])
particle = np.fromfile(sys.argv[2], np.int32)
frame = np.fromfile(sys.argv[3], np.int32)
same = np.ones(len(detection), bool)
same[np.cumsum(size) - size] = False
before, after = detection[:-1][same[1:]], detection[1:][same[1:]]
order = np.argsort(particle, kind="stable")
order = order[particle[order] >= 0]
joined = (particle[order][1:] == particle[order][:-1]) & (np.diff(frame[order]) <= REACH_FRAMES)
true_after = np.full(len(particle), -1, np.int64)
true_after[order[:-1][joined]] = order[1:][joined]
right = int((true_after[before] == after).sum())
print(json.dumps({"made": len(before), "right": right, "true": int(joined.sum())}))
