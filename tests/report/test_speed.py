import gc
import io
import time
from collections.abc import Callable
from typing import Any

import pytest

from loadsum.report import renderer, typesetting
from loadsum.report.document import compose, render
from loadsum.report.typeface import shipped_fonts_only


def _best(run: Callable[[], Any], times: int = 3) -> float:
    """Least CPU time of a few runs. [s]"""
    found = []
    for _ in range(times):
        gc.collect()
        start = time.process_time()
        run()
        found.append(time.process_time() - start)
    return min(found)


@pytest.mark.slow
def test_a_report_takes_at_most_three_times_the_renderer_alone_on_the_same_page_description(
    results: dict[str, Any],
) -> None:
    composed = compose(results)
    weasyprint = renderer.load()

    def alone() -> None:
        with shipped_fonts_only(), typesetting.quiet_renderer():
            weasyprint.HTML(
                string=composed.html, base_url="asset:", url_fetcher=typesetting.Shelf(composed.assets)
            ).write_pdf(io.BytesIO())

    ratio = _best(lambda: render(results)) / _best(alone)
    print(f"report / renderer alone: {ratio:.2f}")
    assert ratio <= 3.0


@pytest.mark.slow
def test_a_report_of_24_transformers_takes_at_most_six_times_that_of_one(results: dict[str, Any]) -> None:
    one = results["transformers"][0]
    units = [{**one, "id": f"T-{number}"} for number in range(24)]
    several = {**results, "transformers": units}
    ratio = _best(lambda: render(several), 2) / _best(lambda: render(results), 2)
    print(f"24 transformers / one: {ratio:.2f}")
    assert ratio <= 6.0
