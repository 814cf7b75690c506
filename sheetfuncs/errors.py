"""Every refusal of sheetfuncs: one tree, each with its sentence and the cell error it becomes.

    SheetfuncsError
    |- CellsError               #VALUE!   the cells cannot be read as a regression
    |  |- AddressError                    a range, table or name that is not there or not well formed
    |  |- BlockShapeError                 blocks of unequal height, no rows, too many columns
    |  |- CellKindError                   a cell of the wrong kind in a used column
    |- ArgumentError            #VALUE!   an option with a value that is not allowed
    |- NumbersError             #NUM!     the numbers do not allow a fit
    |  |- TooFewRowsError
    |  |- CollinearPredictorsError
    |  |- NoVariationError
    |- NotApplicableError       #N/A      this test has no meaning for this fit
    |- UnknownFunctionError     #NAME?
    |- WorkbookError            #REF!     the file cannot be read or written
    |  |- WorkbookFormatError             encrypted, damaged, or of a format that is not supported
    |  |- WorkbookUnsafeError             an archive or XML that is not safe to open
    |  |- WorkbookBusyError               someone has the file open
    |  |- SheetNameError                  a sheet that is not there, or a name that is taken or not allowed
    |- InstallError             #VALUE!   an add-in cannot be installed, checked or removed here

A sentence says what was found and where, what is allowed, and what to try.
"""


class SheetfuncsError(Exception):
    """Base of all refusals. `str(error)` is one complete sentence for the person at the sheet."""

    cell_error = "#VALUE!"


class CellsError(SheetfuncsError):
    """The cells cannot be read as a regression."""


class AddressError(CellsError):
    """A range, table or name that is not there or not well formed."""

    cell_error = "#REF!"


class BlockShapeError(CellsError):
    """Blocks of unequal height, without rows, or with too many columns."""


class CellKindError(CellsError):
    """A cell of the wrong kind in a used column."""


class ArgumentError(SheetfuncsError):
    """An option with a value that is not allowed."""


class NumbersError(SheetfuncsError):
    """The numbers do not allow a fit."""

    cell_error = "#NUM!"


class TooFewRowsError(NumbersError):
    """Not more rows than coefficients."""


class CollinearPredictorsError(NumbersError):
    """A predictor that others (or the intercept) determine exactly; `predictors` names them."""

    def __init__(self, sentence: str, predictors: tuple[str, ...] = ()):
        super().__init__(sentence)
        self.predictors = predictors


class NoVariationError(NumbersError):
    """A response without variation, or residuals that are rounding noise only."""


class NotApplicableError(SheetfuncsError):
    """The test has no meaning for this fit."""

    cell_error = "#N/A"


class UnknownFunctionError(SheetfuncsError):
    """A formula that calls a function we do not have."""

    cell_error = "#NAME?"


class WorkbookError(SheetfuncsError):
    """The file cannot be read or written."""

    cell_error = "#REF!"


class WorkbookFormatError(WorkbookError):
    """Encrypted, damaged, or of a format that is not supported."""


class WorkbookUnsafeError(WorkbookError):
    """An archive or XML that is not safe to open."""


class WorkbookBusyError(WorkbookError):
    """Someone has the file open."""


class SheetNameError(WorkbookError):
    """A sheet that is not there, or a name that is taken or not allowed."""


class InstallError(SheetfuncsError):
    """An add-in cannot be installed, checked or removed here."""
