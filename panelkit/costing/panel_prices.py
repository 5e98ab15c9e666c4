"""What a panel costs on each platform."""

from collections.abc import Iterable, Mapping, Sequence

from panelkit.config import PlatformSection, ProgrammeSection
from panelkit.costing.pricing import programme_cost
from panelkit.errors import NoPanelError
from panelkit.records import PanelCost, PriceList

__all__ = ["PanelPricer"]


class PanelPricer:
    """Prices marker sets on all platforms; each set is priced once.

    Parameters
    ----------
    programme : ProgrammeSection
        Samples, currency, repeats.
    platforms : mapping of str to PlatformSection
        Where panels may be run.
    prices : PriceList
        Quotes of all platforms.
    """

    def __init__(
        self,
        programme: ProgrammeSection,
        platforms: Mapping[str, PlatformSection],
        prices: PriceList,
    ) -> None:
        self._programme = programme
        self._platforms = platforms
        self._prices = prices
        self._known: dict[frozenset[str], tuple[PanelCost, ...]] = {}

    def costs(self, markers: Sequence[str]) -> tuple[PanelCost, ...]:
        """Return the panel's cost on each platform where it can be run, cheapest first.

        Parameters
        ----------
        markers : sequence of str
            Features of the panel.

        Returns
        -------
        tuple of PanelCost
            Empty where no platform can run the panel; equals by name of the platform.

        Raises
        ------
        InputDataError
            A price that is needed is missing.
        """
        key = frozenset(markers)
        if key not in self._known:
            found = [self._cost(markers, name) for name in self._platforms]
            able = [cost for cost in found if cost is not None]
            self._known[key] = tuple(
                sorted(able, key=lambda cost: (cost.total, cost.platform))
            )
        return self._known[key]

    def lowest(self, markers: Iterable[str]) -> float:
        """Return the cost on the cheapest platform; NaN where none can run the panel.

        Raises
        ------
        InputDataError
            A price that is needed is missing.
        """
        costs = self.costs([str(marker) for marker in markers])
        return float(costs[0].total) if costs else float("nan")

    def _cost(self, markers: Sequence[str], platform: str) -> PanelCost | None:
        try:
            return programme_cost(
                self._programme,
                self._platforms[platform],
                self._prices.for_panel(list(markers), platform),
                quotes=self._prices.quotes(platform),
            )
        except NoPanelError:
            return None
