"""What a panel costs on each platform."""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from panelkit.config import KitSection, PlatformSection, ProgrammeSection
from panelkit.costing.pricing import programme_cost
from panelkit.errors import InputDataError, NoPanelError, UsageError, name_some
from panelkit.records import NO_CONFLICTS, Conflicts, PanelCost, PriceList

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
    kits : iterable of KitSection
        Kits that may be bought beside the assays of any platform.
    conflicts : Conflicts
        Markers that must be kept apart.
    """

    def __init__(
        self,
        programme: ProgrammeSection,
        platforms: Mapping[str, PlatformSection],
        prices: PriceList,
        kits: Iterable[KitSection] = (),
        conflicts: Conflicts = NO_CONFLICTS,
    ) -> None:
        self.programme = programme
        self.platforms = dict(platforms)
        self.prices = prices
        self.kits = tuple(kits)
        self.conflicts = conflicts
        self._known: dict[tuple[str, frozenset[str]], PanelCost | NoPanelError] = {}

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
        found = [self.attempt(markers, name) for name in self.platforms]
        able = [cost for cost in found if isinstance(cost, PanelCost)]
        return tuple(sorted(able, key=lambda cost: (cost.total, cost.platform)))

    def attempt(
        self, markers: Sequence[str], platform: str
    ) -> PanelCost | NoPanelError:
        """Return the panel's cost on one platform, or why it cannot be run there.

        Parameters
        ----------
        markers : sequence of str
            Features of the panel.
        platform : str
            Name of the platform.

        Returns
        -------
        PanelCost or NoPanelError
            The refusal is returned, not raised.

        Raises
        ------
        UsageError
            There is no platform of that name.
        InputDataError
            A price that is needed is missing.
        """
        if platform not in self.platforms:
            raise UsageError(
                code="platform-unknown",
                where=f"platform '{platform}'",
                what=f"no such platform is described (got {platform!r})",
                accepted=f"described are {name_some(self.platforms)}",
                next_step="Name one of these, or describe it",
            )
        key = platform, frozenset(markers)
        if key not in self._known:
            self._known[key] = self._price(markers, platform)
        return self._known[key]

    def changed(self, platform: str = "", **keys: object) -> "PanelPricer":
        """Return the same prices for another programme or another platform.

        Parameters
        ----------
        platform : str
            Platform whose keys change; empty for the programme.
        **keys : object
            Keys of ``[programme]`` or ``[platform.NAME]`` and their new values,
            checked already.

        Returns
        -------
        PanelPricer
            This one stays as it is.
        """
        programme, platforms = self.programme, dict(self.platforms)
        if platform:
            platforms[platform] = platforms[platform].model_copy(update=keys)
        else:
            programme = programme.model_copy(update=keys)
        return PanelPricer(programme, platforms, self.prices, self.kits, self.conflicts)

    def repriced(self, prices: PriceList) -> "PanelPricer":
        """Return the same programme and platforms with another price list."""
        return PanelPricer(
            self.programme, self.platforms, prices, self.kits, self.conflicts
        )

    def alone(self, features: Sequence[str]) -> NDArray[np.float64]:
        """Return what each feature costs as a panel of its own; NaN where unknown.

        Parameters
        ----------
        features : sequence of str
            Features of the cohort.

        Returns
        -------
        ndarray of shape (n_features,), float64
            On the cheapest platform. Features without a row of their own share the
            price for any marker.
        """
        named = {row.marker for row in self.prices.rows}
        common: float | None = None
        found = np.empty(len(features))
        for place, feature in enumerate(features):
            analyte = self.prices.analytes.get(feature, feature)
            if feature in named or analyte in named:
                found[place] = self._alone(feature)
                continue
            if common is None:
                common = self._alone(feature)
            found[place] = common
        return found

    def _alone(self, feature: str) -> float:
        try:
            return self.lowest([feature])
        except (InputDataError, UsageError):  # a missing quote, or a reference
            return float("nan")

    def lowest(self, markers: Iterable[str]) -> float:
        """Return the cost on the cheapest platform; NaN where none can run the panel.

        Raises
        ------
        InputDataError
            A price that is needed is missing.
        """
        costs = self.costs([str(marker) for marker in markers])
        return float(costs[0].total) if costs else float("nan")

    def _price(self, markers: Sequence[str], platform: str) -> PanelCost | NoPanelError:
        try:
            cost = programme_cost(
                self.programme,
                self.platforms[platform],
                self.prices.for_panel(list(markers), platform),
                quotes=self.prices.quotes(platform),
                kits=[self._for_features(kit, markers) for kit in self.kits],
                conflicts=self.conflicts,
            )
        except NoPanelError as refusal:
            return refusal
        return replace(cost, platform=platform)

    def _for_features(self, kit: KitSection, markers: Sequence[str]) -> KitSection:
        """Return a kit of analytes as a kit of the panel's features."""
        of_analyte: dict[str, list[str]] = {}
        for marker in markers:
            analyte = self.prices.analytes.get(marker, marker)
            if marker not in kit.markers:
                of_analyte.setdefault(analyte, []).append(marker)
        names = [name for own in kit.markers for name in of_analyte.get(own, [own])]
        return kit.model_copy(update={"markers": tuple(names)}) if of_analyte else kit
