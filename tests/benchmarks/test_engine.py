"""The engine is as much faster than plain baselines as was asked, and small in memory."""

import pytest

from tests.benchmarks.engine import five_hundred_customers, forty_customers, memory_mb, ten_thousand_like
from tests.benchmarks.engine import thousand_transformers as small_groups

ROOM = 0.7  # for other work on the machine while the test runs; `python -m tests.benchmarks.engine` prints the ratios


@pytest.mark.slow
@pytest.mark.parametrize("lines", [forty_customers, five_hundred_customers, ten_thousand_like, small_groups])
def test_the_engine_is_faster_than_the_baseline_of_the_same_run(lines):
    for line in lines():
        print(f"{line.name}: {line.ratio:.1f} times faster than {line.baseline}, wanted {line.target:.0f}")
        assert line.ratio >= ROOM * line.target


@pytest.mark.slow
def test_five_hundred_customers_add_less_than_150_mb():
    assert memory_mb() < 150.0
