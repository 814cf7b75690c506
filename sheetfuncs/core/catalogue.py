"""Every test of this version, in the order of the sheet: the first of a method is the default, variants follow."""

from __future__ import annotations

from sheetfuncs.core.box_cox import box_cox
from sheetfuncs.core.fit import Fit
from sheetfuncs.core.form import reset
from sheetfuncs.core.goldfeld_quandt import goldfeld_quandt_tests
from sheetfuncs.core.harvey_collier import harvey_collier
from sheetfuncs.core.independence import breusch_godfrey_both, durbin_watson, durbin_watson_tests
from sheetfuncs.core.influence import outlier_test, press
from sheetfuncs.core.mean import residual_mean
from sheetfuncs.core.normality import jarque_bera, shapiro_wilk
from sheetfuncs.core.normality_tests import anderson_darling, dagostino_k2, jarque_bera_small_sample, lilliefors
from sheetfuncs.core.portmanteau import default_lags, portmanteau_tests
from sheetfuncs.core.rainbow import rainbow
from sheetfuncs.core.results import Result
from sheetfuncs.core.variance import breusch_pagan, breusch_pagan_fitted
from sheetfuncs.core.white import white, white_fitted


def all_statistics(fit: Fit) -> tuple[Result, ...]:
    """Every test and figure of the fit, each a Statistic or the reason why it does not apply."""
    return (
        residual_mean(fit), *_form(fit), *_variance(fit), *_independence(fit), *_normality(fit), outlier_test(fit),
        press(fit),
    )


def _form(fit: Fit) -> list[Result]:
    return [
        *(reset(fit, powers, of=of) for of in ("fitted", "predictors") for powers in ((2, 3), (2,))),
        rainbow(fit), rainbow(fit, by="mahalanobis"),
        harvey_collier(fit),
        box_cox(fit),
    ]


def _variance(fit: Fit) -> list[Result]:
    return [
        breusch_pagan(fit, studentize=True), breusch_pagan(fit, studentize=False), breusch_pagan_fitted(fit),
        white(fit), white_fitted(fit),
        *goldfeld_quandt_tests(fit), *goldfeld_quandt_tests(fit, fraction=0.2),
    ]


def _independence(fit: Fit) -> list[Result]:
    lags = default_lags(fit.n)
    tried = [lags, *(lag for lag in (1, 2, 4, 8) if lag != lags and lag < fit.n)]
    return [
        durbin_watson(fit), *durbin_watson_tests(fit),
        *(
            result for lags in (1, 2, 4) for before_first in ("zeros", "omitted")
            for result in breusch_godfrey_both(fit, lags, before_first=before_first)
        ),
        *portmanteau_tests(fit, tried),
    ]


def _normality(fit: Fit) -> list[Result]:
    return [
        shapiro_wilk(fit), anderson_darling(fit), lilliefors(fit), jarque_bera(fit), jarque_bera_small_sample(fit),
        dagostino_k2(fit),
    ]
