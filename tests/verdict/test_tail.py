"""Truth is published: SciPy's chi-squared distribution as a referee, and a table's five percent."""

import pytest
from scipy.stats import chi2

from imgcover.verdict.tail import chi_squared_above


@pytest.mark.parametrize("freedom", [1, 2, 3, 4, 7, 10, 25])
def test_the_referee_says_the_same(freedom):
    for squared in (1e-9, 0.3, 1.0, 4.7, 20.0, 90.0, 1200.0):
        # both are good to some units of the last digit
        assert chi_squared_above(squared, freedom=freedom) == pytest.approx(
            chi2.sf(squared, freedom), rel=1e-11
        )


@pytest.mark.parametrize(("freedom", "squared"), [(1, 3.841), (2, 5.991), (3, 7.815), (10, 18.307)])
def test_five_percent_as_the_tables_have_it(freedom, squared):
    """Abramowitz & Stegun, table 26.8 (from memory); three decimals move the tail by 0.00002."""
    assert chi_squared_above(squared, freedom=freedom) == pytest.approx(0.05, abs=3e-5)


def test_nothing_exceeds_everything_and_no_freedom_is_refused():
    assert chi_squared_above(0.0, freedom=3) == 1.0
    assert chi_squared_above(1e6, freedom=3) == 0.0
    with pytest.raises(ValueError, match="freedom must be at least 1"):
        chi_squared_above(1.0, freedom=0)
