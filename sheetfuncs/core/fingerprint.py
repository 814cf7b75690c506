"""A fingerprint of the data that a fit rests on, which anybody can compute again."""

from __future__ import annotations

import hashlib

import numpy as np

from sheetfuncs.core.design import Design


def data_fingerprint(design: Design) -> str:
    """SHA-256, in hexadecimal, of the used data.

    What is hashed, so that others can reproduce it: the names of the response and of the predictor columns in UTF-8,
    each followed by a line feed; one more line feed; then the used rows in worksheet order, each as its response and
    its predictor columns in 8-byte little-endian IEEE 754 numbers (negative zero as zero). Categories are their 0 and
    1 columns. Rows left out, cell formats and the settings do not enter.
    """
    digest = hashlib.sha256()
    for name in (design.response_name, *design.column_names):
        digest.update(f"{name}\n".encode("utf-8", "surrogatepass"))
    digest.update(b"\n")
    table = np.column_stack([design.response, design.columns]) + 0.0
    digest.update(np.ascontiguousarray(table, dtype="<f8").tobytes())
    return digest.hexdigest()
