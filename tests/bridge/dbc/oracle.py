"""Reads databases and decodes payloads with Debian's python3-canmatrix: one JSON task on standard input, one JSON answer out."""
import json
import logging
import math
import sys

import canmatrix
import canmatrix.formats

logging.disable(logging.CRITICAL)
answers = []
for task in json.load(sys.stdin):
    database = canmatrix.formats.loadp_flat(task["file"])
    if "again" in task:
        canmatrix.formats.dumpp({"": database}, task["again"])
    frames = []
    for case in task["cases"]:
        frame = database.frame_by_id(canmatrix.ArbitrationId(case["identifier"], case["extended"]))
        answer = {"name": frame.name, "bytes": frame.size, "flexible": bool(frame.is_fd), "signals": {}}
        for signal in frame.signals:
            answer["signals"][signal.name] = {
                "scale": float(signal.factor),
                "offset": float(signal.offset),
                "least": None if signal.min is None else float(signal.min),
                "unit": signal.unit,
                "values": sorted((int(raw), name) for raw, name in signal.values.items()),
                "float": bool(signal.is_float),
                "signed": bool(signal.is_signed),
            }
        decoded = frame.decode(bytes.fromhex(case["payload"]))
        answer["raw"] = {
            name: value.raw_value if math.isfinite(value.raw_value) else str(value.raw_value)
            for name, value in decoded.items()
        }
        frames.append(answer)
    answers.append(frames)
json.dump(answers, sys.stdout)
