"""The whole job on pandas, scipy, numpy and netCDF4: CSV to pathlines.nc, frames.nc and grid.nc with the same columns.

Written as somebody at home in these libraries would: no Python loop over particles, one k-d tree a frame, fits by shifted
slices where the window has no gap and by closed 3 x 3 solutions elsewhere. It does less than `wakeloom process`: links by
constant velocity alone and has no link risk (0 is written), no fit again without screened samples, no test of a sample
against its own pathline, no bins that overlap, pathlines a bin counted as visits, no noise-corrected stresses beyond the
mean square standard error, no scan for bad rows, no hash of the input, no digest, no read-back, no report. Position noise
is measured from the residuals of the fits.

usage: whole-job.py CSV OUT RATE_HZ SCALE_MM_PER_PX SPAN_FRAMES BINS_A_SIDE
"""

import json
import os
import sys

import netCDF4
import numpy as np
import pandas as pd
from scipy.spatial import cKDTree

BRIDGE = 2
SHORTEST = 5
THRESHOLD = 2.0
NEIGHBOURS = 8
CHUNK = 1 << 20
FLAG_BRIDGED, FLAG_NEAR_END, FLAG_OFF_NEIGHBOURS = 2, 4, 16


def one_to_one(distance, candidate, targets):
    """Choices of nearest candidates: shortest first, each target once, second choices where the first is taken."""
    rows, ways = distance.shape
    chosen = np.full(rows, -1)
    taken = np.zeros(targets, bool)
    for way in range(ways):
        open_rows = np.flatnonzero((chosen < 0) & np.isfinite(distance[:, way]))
        open_rows = open_rows[~taken[candidate[open_rows, way]]]
        order = open_rows[np.argsort(distance[open_rows, way], kind="stable")]
        _, first = np.unique(candidate[order, way], return_index=True)
        chosen[order[first]] = candidate[order[first], way]
        taken[candidate[order[first], way]] = True
    return chosen


def first_flow(a, b, reach):
    """Displacements from frame a to frame b: nearest ones, then along their local mean, narrower each time."""
    tree_b = cKDTree(b)
    flow = np.zeros_like(a)
    for share in (1.0, 0.8, 0.6, 0.6):
        distance, candidate = tree_b.query(a + flow, k=2, distance_upper_bound=share * reach)
        chosen = one_to_one(distance, candidate, len(b))
        made = np.flatnonzero(chosen >= 0)
        step = b[chosen[made]] - a[made]
        _, near = cKDTree(a[made]).query(a, k=min(24, len(made)))
        flow = np.median(step[near], axis=1)
    return flow


def link(frame_start, xy, spacing):
    """Pathline number of each row, by constant velocity and one-to-one choice."""
    reach = 0.3 * spacing
    pathline = np.full(len(xy), -1, np.int32)
    frames = len(frame_start) - 1
    first = xy[frame_start[0] : frame_start[1]]
    second = xy[frame_start[1] : frame_start[2]]
    velocity = first_flow(first, second, 0.6 * spacing)
    position = first
    number = np.arange(len(first), dtype=np.int32)
    missed = np.zeros(len(first), np.int32)
    pathline[: len(first)] = number
    begun = len(first)
    for k in range(1, frames):
        rows = slice(frame_start[k], frame_start[k + 1])
        now = xy[rows]
        tree = cKDTree(now)
        predicted = position + velocity * (missed + 1)[:, None]
        distance, candidate = tree.query(predicted, k=2, distance_upper_bound=reach)
        chosen = one_to_one(distance, candidate, len(now))
        made = np.flatnonzero(chosen >= 0)
        detection = chosen[made]
        step = (now[detection] - position[made]) / (missed[made] + 1)[:, None]
        own = np.full(len(now), -1, np.int32)
        own[detection] = number[made]
        fresh = np.flatnonzero(own < 0)
        # What begins here moves as the pathlines around it do.
        _, near = cKDTree(now[detection]).query(now[fresh], k=4)
        fresh_velocity = step[near].mean(axis=1)
        own[fresh] = np.arange(begun, begun + len(fresh), dtype=np.int32)
        begun += len(fresh)
        pathline[rows] = own
        waiting = np.flatnonzero((chosen < 0) & (missed < BRIDGE))
        position = np.concatenate([now[detection], now[fresh], position[waiting]])
        velocity = np.concatenate([step, fresh_velocity, velocity[waiting]])
        number = np.concatenate([number[made], own[fresh], number[waiting]])
        missed = np.concatenate(
            [np.zeros(len(made) + len(fresh), np.int32), missed[waiting] + 1]
        )
    return pathline


def even_weights(span, interval):
    """Position, velocity, acceleration over `span` even frames at its middle, and the variances they leave of noise 1."""
    t = (np.arange(span) - span // 2) * interval
    design = np.stack([np.ones(span), t, t * t], axis=1)
    inverse = np.linalg.inv(design.T @ design)
    solve = inverse @ design.T
    return solve[0], solve[1], 2 * solve[2], inverse[0, 0], inverse[1, 1], 4 * inverse[2, 2]


def fit(frame, start, size, xy, span, interval):
    """Position, velocity, acceleration (columns x, y) and roots of their noise gains, samples in pathline order."""
    n = len(frame)
    half = span // 2
    begin = np.repeat(start, size)
    end = begin + np.repeat(size, size)
    index = np.arange(n)
    p, v, a = (np.empty((n, 2)) for _ in range(3))
    gains = np.empty((n, 3))
    wp, wv, wa, gp, gv, ga = even_weights(span, interval)
    inside = np.zeros(n, bool)
    middle = slice(half, n - half)
    inside[middle] = (
        (index[middle] - begin[middle] >= half)
        & (end[middle] - index[middle] > half)
        & (frame[2 * half :] - frame[: n - 2 * half] == 2 * half)
    )
    for axis in range(2):
        column = np.ascontiguousarray(xy[:, axis])
        for low in range(half, n - half, CHUNK):
            high = min(n - half, low + CHUNK)
            sums = np.zeros((3, high - low))
            for j in range(span):
                part = column[low - half + j : high - half + j] - column[low:high]
                sums[0] += wp[j] * part
                sums[1] += wv[j] * part
                sums[2] += wa[j] * part
            p[low:high, axis] = column[low:high] + sums[0]
            v[low:high, axis] = sums[1]
            a[low:high, axis] = sums[2]
    gains[:] = (gp, gv, ga)
    rest = np.flatnonzero(~inside)
    for low in range(0, len(rest), CHUNK // 4):
        rows = rest[low : low + CHUNK // 4]
        first = np.clip(rows - half, begin[rows], np.maximum(begin[rows], end[rows] - span))
        member = first[:, None] + np.arange(span)
        valid = member < end[rows][:, None]
        member = np.minimum(member, n - 1)
        t = (frame[member] - frame[rows][:, None]) * interval
        # Nothing farther than the span.
        valid &= np.abs(t) <= (span - 1) * interval + 1e-9
        w = valid.astype(float)
        # Normal equations in frames, so that they are well conditioned.
        s = t / interval
        m = [(w * s**power).sum(axis=1) for power in range(5)]
        matrix = np.stack([np.stack([m[i + j] for j in range(3)], axis=-1) for i in range(3)], axis=-2)
        inverse = np.linalg.pinv(matrix, hermitian=True)
        for axis in range(2):
            d = (xy[member, axis] - xy[rows, axis][:, None]) * w
            right = np.stack([(d * s**power).sum(axis=1) for power in range(3)], axis=-1)
            solution = np.einsum("nij,nj->ni", inverse, right)
            p[rows, axis] = xy[rows, axis] + solution[:, 0]
            v[rows, axis] = solution[:, 1] / interval
            a[rows, axis] = 2 * solution[:, 2] / interval**2
        gains[rows, 0] = inverse[:, 0, 0]
        gains[rows, 1] = inverse[:, 1, 1] / interval**2
        gains[rows, 2] = 4 * inverse[:, 2, 2] / interval**4
    residual = xy[inside] - p[inside]
    noise = np.sqrt((residual**2).mean(axis=0) / (1 - gp))
    return p, v, a, np.sqrt(gains), noise, ~inside


def screen(frame_rows, xy, v, epsilon):
    """Normalised median test against the nearest samples of the same frame; True where a sample fails."""
    failed = np.zeros(len(xy), bool)
    for rows in frame_rows:
        if len(rows) <= NEIGHBOURS:
            continue
        _, near = cKDTree(xy[rows]).query(xy[rows], k=NEIGHBOURS + 1)
        near = near[:, 1:]
        for axis in range(2):
            own = v[rows, axis]
            around = own[near]
            middle = np.median(around, axis=1)
            spread = np.median(np.abs(around - middle[:, None]), axis=1)
            failed[rows] |= np.abs(own - middle) > THRESHOLD * (spread + epsilon[rows, axis])
    return failed


def grid_statistics(xy, v, v_se, use, begin, bins):
    low, high = xy.min(axis=0), xy.max(axis=0)
    width = (high - low) / bins
    cell = np.minimum(((xy - low) / width).astype(np.int32), bins - 1)
    flat = (cell[:, 1] * bins + cell[:, 0])[use]
    visits = np.ones(len(flat), bool)
    visits[1:] = (flat[1:] != flat[:-1]) | (begin[use][1:] != begin[use][:-1])
    size = bins * bins
    count = np.bincount(flat, minlength=size)
    out = {"samples": count.astype(np.int32), "pathlines": np.bincount(flat[visits], minlength=size).astype(np.int32)}
    with np.errstate(divide="ignore", invalid="ignore"):
        mean = [np.bincount(flat, v[use, axis], size) / count for axis in range(2)]
        off = [v[use, axis] - mean[axis][flat] for axis in range(2)]
        for name, axis in (("u", 0), ("v", 1)):
            out[name] = mean[axis]
            out[name + "_se"] = np.sqrt(np.bincount(flat, off[axis] ** 2, size) / (count - 1) / out["pathlines"])
        noise = [np.bincount(flat, v_se[use, axis] ** 2, size) / count for axis in range(2)]
        for name, i, j in (("uu", 0, 0), ("uv", 0, 1), ("vv", 1, 1)):
            product = off[i] * off[j]
            raw = np.bincount(flat, product, size) / (count - 1)
            out[name + "_raw"] = raw
            out[name] = raw - noise[i] if i == j else raw
            spread = np.bincount(flat, (product - raw[flat]) ** 2, size) / (count - 1)
            out[name + "_se"] = np.sqrt(spread / out["pathlines"])
    return low, width, out


def write(path, dimensions, columns):
    with netCDF4.Dataset(path, "w", format="NETCDF4") as file:
        for name, length in dimensions.items():
            file.createDimension(name, length)
        for name, (shape, kind, values) in columns.items():
            file.createVariable(name, kind, shape)[:] = values


def main(csv, out, rate, scale, span, bins):
    os.makedirs(out, exist_ok=True)
    interval = 1 / rate
    table = pd.read_csv(csv, dtype={"frame": np.int32, "x": np.float64, "y": np.float64})
    frame = table["frame"].to_numpy()
    xy = table[["x", "y"]].to_numpy() * scale
    del table
    frame_start = np.concatenate([[0], np.flatnonzero(np.diff(frame)) + 1, [len(frame)]])
    box = xy.max(axis=0) - xy.min(axis=0)
    spacing = np.sqrt(box[0] * box[1] / (frame_start[1] - frame_start[0]))
    pathline = link(frame_start, xy, spacing)

    size = np.bincount(pathline)
    kept = size >= SHORTEST
    detection = np.argsort(pathline, kind="stable")
    detection = detection[kept[pathline[detection]]]
    size = size[kept].astype(np.int64)
    start = np.concatenate([[0], np.cumsum(size)[:-1]])
    frame, measured = frame[detection], xy[detection]
    del xy, pathline
    p, v, a, roots, noise, off_centre = fit(frame, start, size, measured, span, interval)
    v_se = roots[:, 1:2] * noise
    begin = np.repeat(start, size)

    by_frame = np.argsort(frame, kind="stable")
    frames, frame_size = np.unique(frame, return_counts=True)
    frame_first = np.concatenate([[0], np.cumsum(frame_size)])
    failed = screen(np.split(by_frame, frame_first[1:-1]), measured, v, v_se)
    bridged = np.zeros(len(frame), bool)
    bridged[1:] = (np.diff(frame) > 1) & (begin[1:] == begin[:-1])
    flags = (FLAG_BRIDGED * bridged + FLAG_NEAR_END * off_centre + FLAG_OFF_NEIGHBOURS * failed).astype(np.uint16)

    low, width, statistics = grid_statistics(p, v, v_se, ~failed, begin, bins)
    axis = {name: low[k] + (np.arange(bins) + 0.5) * width[k] for k, name in enumerate("xy")}
    bounds = {
        name: low[k] + width[k] * np.stack([np.arange(bins), np.arange(bins) + 1], axis=1) for k, name in enumerate("xy")
    }
    grid = {name: ((name,), "f8", axis[name]) for name in "xy"}
    grid |= {f"{name}_bounds": ((name, "edge"), "f8", bounds[name]) for name in "xy"}
    for name, values in statistics.items():
        kind = "i4" if name in ("samples", "pathlines") else "f4"
        grid[name] = (("y", "x"), kind, values.reshape(bins, bins))
    write(f"{out}/grid.nc", {"x": bins, "y": bins, "edge": 2}, grid)

    last = start + size - 1
    sample, whole = ("sample",), ("pathline",)
    time = frame * interval
    pathlines = {
        "pathline": (whole, "i4", np.arange(len(size))),
        "row_size": (whole, "i4", size),
        "first_frame": (whole, "i4", frame[start]),
        "last_frame": (whole, "i4", frame[last]),
        "frame": (sample, "i4", frame),
        "time": (sample, "f8", time),
        "x": (sample, "f8", p[:, 0]),
        "y": (sample, "f8", p[:, 1]),
    }
    for names, values in (("u v", v), ("ax ay", a)):
        for k, name in enumerate(names.split()):
            pathlines[name] = (sample, "f4", values[:, k])
    for column, names in enumerate(("x_se y_se", "u_se v_se", "ax_se ay_se")):
        for k, name in enumerate(names.split()):
            pathlines[name] = (sample, "f4", roots[:, column] * noise[k])
    pathlines |= {
        "measured_x": (sample, "f8", measured[:, 0]),
        "measured_y": (sample, "f8", measured[:, 1]),
        "link_risk": (sample, "f4", np.zeros(len(frame), np.float32)),
        "detection": (sample, "i8", detection),
        "flags": (sample, "u2", flags),
    }
    write(f"{out}/pathlines.nc", {"pathline": len(size), "sample": len(frame)}, pathlines)

    thin = by_frame[:: max(1, -(-len(by_frame) // 65536))]
    number = np.repeat(np.arange(len(size), dtype=np.int32), size)
    seen, shown = ("frame",), ("overview",)
    in_frames = {
        "frame": (seen, "i4", frames),
        "time": (seen, "f8", frames * interval),
        "row_size": (seen, "i4", frame_size),
        "first_row": (seen, "i8", frame_first[:-1]),
        "pathline": (whole, "i4", np.arange(len(size))),
        "x": (sample, "f8", p[by_frame, 0]),
        "y": (sample, "f8", p[by_frame, 1]),
        "u": (sample, "f4", v[by_frame, 0]),
        "v": (sample, "f4", v[by_frame, 1]),
        "flags": (sample, "u2", flags[by_frame]),
        "pathline_index": (sample, "i4", number[by_frame]),
        "pathlines_row": (sample, "i4", by_frame),
        "sample_time": (sample, "f8", time[by_frame]),
        "overview_x": (shown, "f8", p[thin, 0]),
        "overview_y": (shown, "f8", p[thin, 1]),
        "overview_u": (shown, "f4", v[thin, 0]),
        "overview_v": (shown, "f4", v[thin, 1]),
        "overview_flags": (shown, "u2", flags[thin]),
        "overview_pathline": (shown, "i4", number[thin]),
        "overview_frame": (shown, "i4", frame[thin]),
    }
    lengths = {"frame": len(frames), "pathline": len(size), "sample": len(frame), "overview": len(thin)}
    write(f"{out}/frames.nc", lengths, in_frames)
    counts = {"samples": len(frame), "pathlines": len(size), "failed": int(failed.sum()), "noise": noise.tolist()}
    with open(f"{out}/run.json", "w") as file:
        json.dump(counts, file)


if __name__ == "__main__":
    main(sys.argv[1], sys.argv[2], float(sys.argv[3]), float(sys.argv[4]), int(sys.argv[5]), int(sys.argv[6]))
