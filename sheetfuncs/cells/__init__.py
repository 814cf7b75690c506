"""Blocks of cell values <-> arrays; addresses; the ledger of rows used and left out."""
