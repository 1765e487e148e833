#!/usr/bin/env python3
"""Reads a table of samples with pandas, as a practitioner would; one JSON line with its times and a digest of the columns.

usage: read_peer.py FILE READER [SEPARATOR DECIMAL]    READER: pandas, pandas_round_trip, loadtxt
Importing the library is not counted; the file is warm in the page cache when the benchmark calls this.
"""
import hashlib
import json
import sys
import time

import numpy as np
import pandas as pd


def read(path, reader, separator, decimal):
    if reader == "loadtxt":
        return np.loadtxt(path, delimiter=separator, skiprows=1)
    precision = "round_trip" if reader == "pandas_round_trip" else None
    return pd.read_csv(path, engine="c", sep=separator, decimal=decimal, float_precision=precision).to_numpy()


def main():
    path, reader = sys.argv[1:3]
    separator, decimal = sys.argv[3:5] if len(sys.argv) > 3 else (",", ".")
    began, began_processor = time.perf_counter(), time.process_time()
    table = read(path, reader, separator, decimal)
    seconds, processor = time.perf_counter() - began, time.process_time() - began_processor
    columns = [hashlib.sha256(np.ascontiguousarray(table[:, c], dtype="<f8").tobytes()).hexdigest()
               for c in range(1, table.shape[1])]
    print(json.dumps({"reader": reader, "rows": int(table.shape[0]), "seconds": seconds, "processor": processor, "digests": columns}))


if __name__ == "__main__":
    main()
