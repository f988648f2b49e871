"""The synthetic bench, worked out once, and benches made from numbers."""

import pytest

from composer.fit.reading import read_bench

from . import synthetic


@pytest.fixture(scope="session")
def clean():
    """The demo bench without noise: times in s, pressures in kPa, strains."""
    return synthetic.exact()


@pytest.fixture(scope="session")
def as_bench():
    """A maker of benches from (time, pressure, strain) and a head."""
    return lambda rows, head=synthetic.HEAD: read_bench(synthetic.text(rows, head), "bench.csv")


@pytest.fixture(scope="session")
def clean_drive(clean, as_bench):
    """The drive of the demo bench without noise."""
    from composer.fit.model import drive_of

    return drive_of(as_bench(clean), synthetic.LOAD_N)
