"""What the worker says of one call, without LibreOffice."""

import pytest

from sheetfuncs.cells.block import Block
from sheetfuncs.hosts.calc.explain_job import explain

RESPONSE = [["Hours"], [1.0], [2.5], [2.0], [4.5], [4.0], [6.5], [None]]
PREDICTOR = [["Pieces"], [1.0], [2.0], [3.0], [4.0], [5.0], [6.0], [7.0]]


def sentence(name: str, *given: object) -> str:
    blocks = [Block.from_rows(value) for value in given if isinstance(value, list)]
    places = iter(range(len(blocks)))
    arguments = [{"block": next(places)} if isinstance(value, list) else {"value": value} for value in given]
    answer, part = explain({"name": name, "arguments": arguments}, blocks, lambda text: None)
    assert part is None
    return answer["sentence"]


@pytest.mark.parametrize(
    ("given", "expected"),
    [
        (("FIT_DURBIN_WATSON", RESPONSE[:7], PREDICTOR[:7]), "FIT_DURBIN_WATSON gives a value."),
        (("FIT_DURBIN_WATSON", RESPONSE, PREDICTOR), "1 of 7 rows left out: row 8 (blank in response (Hours))."),
        (("FIT_VIF", [["a", "b"], [1.0, 2.0], [2.0, 4.0], [3.0, 6.0], [4.0, 8.0]]), "FIT_VIF gives #NUM!. "),
        (("FIT_RESET_P", [["Hours"], ["x"], [2.0]], PREDICTOR[:3]), "FIT_RESET_P gives #VALUE!. "),
        (("FIT_WHY", RESPONSE, PREDICTOR), "FIT_WHY says: ok; 1 of 7 rows left out"),
        (("FIT_DURBIN_WATSON_BOUNDS", 20.0, 2.0, 7.0), "FIT_DURBIN_WATSON_BOUNDS gives #VALUE!. "),
    ],
)
def test_sentences(given, expected):
    assert expected in sentence(*given)


def test_a_column_of_values_says_what_rows_left_out_show():
    said = sentence("FIT_LEVERAGE", [[1.0], [2.5], [2.0], [4.5], [None]], [[1.0], [2.0], [3.0], [4.0], [5.0]])
    assert said == (
        "FIT_LEVERAGE gives its values. 1 of 5 rows left out: row 5 (blank in response). Those show #N/A."
    )
