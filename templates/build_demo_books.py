"""Builds the three demonstration workbooks beside this script: `python templates/build_demo_books.py`.

All three belong to one invented tile works; every number is drawn from a fixed seed, so that a second build gives
the same bytes.
"""

from pathlib import Path

from demo_books import dryer_gas, kiln_energy, order_hours


def build(folder: Path) -> list[Path]:
    """Writes the three workbooks into `folder`, which must exist, and returns their paths."""
    return [book.write(folder) for book in (kiln_energy, dryer_gas, order_hours)]


if __name__ == "__main__":
    for path in build(Path(__file__).parent):
        print(path)
