"""A report on invented records, for what depends on their number only."""

from collections.abc import Sequence

from sweepmill.analysis.estimate import Estimate
from sweepmill.experiment.cost import Cost, Options
from sweepmill.experiment.record import Band, Record


def invented_cost(sizes: Sequence[int], rates: Sequence[float], options: Options | None = None) -> Cost:
    """Records of rings of these sizes and rates, 0.9 of all outcomes random, at six depths up to twice the size."""
    records = [
        _record(sites, rate, layer)
        for sites in sizes
        for rate in rates
        for layer in sorted({max(1, round(2 * sites / 2**power)) for power in range(6)})
    ]
    return Cost("5" * 64, tuple(records), None, options or Options())


def _record(sites: int, rate: float, layer: int) -> Record:
    measured = sites * rate * layer
    bits, width = 0.9 * measured, measured**0.5
    band = Band(max(0.0, bits - width), bits, bits + width, exact=True)
    any_twice = Estimate(bits / 2 + 0.3, 0.01)
    place = f"{sites:032x}{round(1e6 * rate):032x}", {"sites": sites, "measurement_rate": rate}
    share = Estimate(0.9, 0.001)
    return Record(*place, layer, 400, Estimate(bits, 0.05), band, any_twice, None, None, measured, share, sites)
