"""`StabilitySelector`: stability selection in the grammar of scikit-learn."""

from numbers import Integral, Real
from typing import Any, Final, Self

import numpy as np
from numpy.typing import NDArray
from sklearn.base import BaseEstimator
from sklearn.feature_selection import SelectorMixin
from sklearn.utils._param_validation import Interval, StrOptions
from sklearn.utils.multiclass import check_classification_targets, type_of_target
from sklearn.utils.validation import check_is_fitted, validate_data

from panelkit.config import SEED, SHORTLIST
from panelkit.fits import ArraySource, Family
from panelkit.runtime import generator
from panelkit.stability.bounds import BOUNDS
from panelkit.stability.selection import SELECTORS, ShortlistRules, select_markers
from panelkit.stability.subsamples import SMALLEST_CLASS, draw_pairs, outcome_strata

__all__ = ["StabilitySelector"]

FAMILIES: Final = ("auto", "binomial", "multinomial", "gaussian")
VAR_COLUMNS: Final = ("frequency", "frequency_low", "frequency_high", "shortlist")


class StabilitySelector(SelectorMixin, BaseEstimator):  # type: ignore[misc]
    """Select the features that L1 fits pick again and again over halves of the rows.

    Parameters
    ----------
    n_subsamples : int
        Halves in all, an even number: complementary pairs.
    threshold : float or None
        Selection frequency from which a feature is selected, above 0.5 to 1. None: it
        follows from `markers_per_subsample` and `false_markers`.
    markers_per_subsample : int or None
        How many features a subsample may pick. None: it follows from the other two.
    false_markers : float or None
        Tolerated expected number of selected features whose chance is below average.
        With the other two given it follows and is not read.
    bound : {"worst-case", "unimodal", "r-concave"}
        The bound that decides.
    selector : {"lasso", "elastic-net", "univariate"}
        What picks in a subsample.
    l1_share : float
        Share of the L1 part of the elastic net.
    select : {"shortlist", "candidates"}
        What is selected: features under error control, which may be none, or what
        panels would be built from.
    candidates : int
        Companion groups, and univariate features, that become candidates.
    companion_correlation : float
        Smallest absolute correlation of companions.
    family : {"auto", "binomial", "multinomial", "gaussian"}
        Kind of outcome. "auto": two values are two classes; text, or whole numbers
        with at least four rows of each, are classes; else a number.
    random_state : int
        Root of the seed tree.
    n_jobs : int
        Threads; no bit of the result depends on it.

    Attributes
    ----------
    selection_frequency_ : ndarray of shape (n_features_in_,)
        Share of subsamples that picked each feature.
    stability_ : Stability
        Everything that was found: intervals, groups, signs, bounds.
    family_ : str
        Kind of outcome that was fitted.
    classes_ : ndarray
        Class labels; only for classes.
    n_features_in_ : int
        Number of features.
    feature_names_in_ : ndarray of str
        Only where the input names its features.

    References
    ----------
    Meinshausen & Buhlmann 2010, JRSS-B 72:417; Shah & Samworth 2013, JRSS-B 75:55.

    Examples
    --------
    >>> import numpy as np
    >>> from panelkit import StabilitySelector
    >>> draws = np.random.default_rng(0)
    >>> y = np.arange(60) % 2
    >>> X = draws.normal(size=(60, 200))
    >>> X[:, 3] += 2.0 * y
    >>> StabilitySelector(n_subsamples=20).fit(X, y).get_support(indices=True)
    array([3])
    """

    _parameter_constraints: dict[str, list[Any]] = {  # noqa: RUF012 - scikit-learn's way
        "n_subsamples": [Interval(Integral, 4, None, closed="left")],
        "threshold": [Interval(Real, 0.5, 1.0, closed="right"), None],
        "markers_per_subsample": [Interval(Integral, 1, None, closed="left"), None],
        "false_markers": [Interval(Real, 0.0, None, closed="neither"), None],
        "bound": [StrOptions(set(BOUNDS))],
        "selector": [StrOptions(set(SELECTORS))],
        "l1_share": [Interval(Real, 0.0, 1.0, closed="right")],
        "select": [StrOptions({"shortlist", "candidates"})],
        "candidates": [Interval(Integral, 1, None, closed="left")],
        "companion_correlation": [Interval(Real, 0.0, 1.0, closed="neither")],
        "family": [StrOptions(set(FAMILIES))],
        "random_state": [Interval(Integral, 0, None, closed="left")],
        "n_jobs": [Interval(Integral, 1, None, closed="left")],
    }

    def __init__(  # noqa: PLR0913 - scikit-learn: one argument a choice
        self,
        n_subsamples: int = SHORTLIST.subsamples,
        *,
        threshold: float | None = SHORTLIST.threshold,
        markers_per_subsample: int | None = None,
        false_markers: float | None = SHORTLIST.false_markers,
        bound: str = SHORTLIST.bound,
        selector: str = SHORTLIST.selector,
        l1_share: float = SHORTLIST.l1_share,
        select: str = "shortlist",
        candidates: int = SHORTLIST.candidates,
        companion_correlation: float = SHORTLIST.companion_correlation,
        family: str = "auto",
        random_state: int = SEED,
        n_jobs: int = 1,
    ) -> None:
        self.n_subsamples = n_subsamples
        self.threshold = threshold
        self.markers_per_subsample = markers_per_subsample
        self.false_markers = false_markers
        self.bound = bound
        self.selector = selector
        self.l1_share = l1_share
        self.select = select
        self.candidates = candidates
        self.companion_correlation = companion_correlation
        self.family = family
        self.random_state = random_state
        self.n_jobs = n_jobs

    def fit(self, X: Any, y: Any, groups: Any = None) -> Self:
        """Count how often each feature is picked.

        Parameters
        ----------
        X : array_like of shape (n_samples, n_features), data frame or AnnData
            Finite numbers.
        y : array_like of shape (n_samples,), or str
            Classes or numbers; for AnnData also the name of a column of ``.obs``.
        groups : array_like of shape (n_samples,), optional
            Subject of each row: a subject's rows stay in one half.

        Returns
        -------
        StabilitySelector
            Itself.

        Raises
        ------
        ValueError
            Input that scikit-learn refuses, or too few rows of a class.
        PanelkitError
            A demand that cannot be met, or a fit that is not possible.
        """
        self._validate_params()
        if isinstance(y, str):
            y = np.asarray(X.obs[y])
        X, y = validate_data(
            self,
            _matrix(X),
            y,
            dtype=[np.float64, np.float32],
            ensure_min_samples=8,
            ensure_min_features=2,
        )
        if self.n_subsamples % 2:
            raise ValueError(
                f"n_subsamples is {self.n_subsamples}; subsamples come in pairs: give "
                "an even number"
            )
        subjects = np.arange(len(y))
        if groups is not None:
            subjects = np.unique(np.asarray(groups), return_inverse=True)[1]
            if subjects.shape != y.shape:
                raise ValueError(
                    f"groups has shape {subjects.shape}; give one label a row of X, "
                    f"{len(y)} in all"
                )
        family, outcome = self._outcome(y, subjects)
        rows = np.arange(len(outcome))
        counts = np.bincount(subjects)
        weights = 1.0 / counts[subjects]
        plan = draw_pairs(
            rows,
            subjects,
            outcome_strata(outcome, family),
            self.n_subsamples // 2,
            generator(self.random_state, "subsamples", "selector"),
        )
        self.stability_ = select_markers(
            _source(X),
            outcome,
            rows,
            subjects,
            weights,
            plan,
            ShortlistRules(
                threshold=self.threshold,
                false_markers=self.false_markers,
                markers_per_subsample=self.markers_per_subsample,
                bound=self.bound,
                selector=self.selector,
                l1_share=self.l1_share,
                candidates=self.candidates,
                companion_correlation=self.companion_correlation,
            ),
            threads=self.n_jobs,
            family=family,
        )
        self.selection_frequency_ = self.stability_.frequency
        self.family_ = family
        return self

    def _outcome(
        self, y: NDArray[Any], subjects: NDArray[np.int64]
    ) -> tuple[Family, NDArray[Any]]:
        """Return the family and the outcome as it is fitted."""
        kind = type_of_target(y, raise_unknown=True)
        smallest = SMALLEST_CLASS
        if kind in ("binary", "multiclass") and self.family != "gaussian":
            labels, code = np.unique(y, return_inverse=True)
            seen = np.unique(np.stack([subjects, code]), axis=1)[1]
            smallest = int(np.bincount(seen).min())
            numeric = y.dtype.kind in "iuf" and self.family == "auto"
            if not (numeric and len(labels) > 2 and smallest < SMALLEST_CLASS):
                return self._classes(labels, code, smallest)
        if self.family in ("binomial", "multinomial"):
            check_classification_targets(y)
            raise ValueError(f"family is {self.family!r} and y has one class")
        number = np.asarray(y, np.float64)
        if np.ptp(number) == 0.0:
            raise ValueError("y has one value; at least two are needed (1 class)")
        return "gaussian", number

    def _classes(
        self, labels: NDArray[Any], code: NDArray[np.int64], smallest: int
    ) -> tuple[Family, NDArray[Any]]:
        if len(labels) < 2:
            raise ValueError("y has one class; at least two classes are needed")
        if smallest < SMALLEST_CLASS:
            raise ValueError(
                f"the smallest class of y has {smallest} subjects; at least "
                f"{SMALLEST_CLASS} are needed to halve it"
            )
        if self.family == "binomial" and len(labels) > 2:
            raise ValueError(
                f"family is 'binomial' and y has {len(labels)} classes; use "
                "'multinomial' or 'auto'"
            )
        self.classes_ = labels
        if len(labels) == 2 and self.family != "multinomial":
            return "binomial", code.astype(np.float64)
        return "multinomial", code

    def _get_support_mask(self) -> NDArray[np.bool_]:
        check_is_fitted(self)
        chosen = (
            self.stability_.shortlist
            if self.select == "shortlist"
            else self.stability_.candidates
        )
        mask = np.zeros(self.n_features_in_, np.bool_)
        mask[chosen] = True
        return mask

    def transform(self, X: Any) -> Any:
        """Return X with the selected features only.

        Parameters
        ----------
        X : array_like of shape (n_samples, n_features), data frame or AnnData
            Of the features that were fitted.

        Returns
        -------
        ndarray, data frame or AnnData
            As it came in, or as `set_output` says.

        Raises
        ------
        ValueError
            Other features than those fitted.
        """
        if hasattr(X, "obs"):
            validate_data(self, _matrix(X), dtype=None, reset=False)
            return X[:, self._get_support_mask()].copy()
        return super().transform(X)

    def to_frame(self) -> Any:
        """Return a data frame, one row a feature: frequency, interval, group, marks."""
        check_is_fitted(self)
        table = self.stability_.to_frame()
        table.insert(0, "feature", self._names())
        return table

    def annotate(self, adata: Any) -> None:
        """Write frequencies and marks into the ``.var`` of an AnnData, in place.

        Parameters
        ----------
        adata : AnnData
            Of the features that were fitted; gets the columns
            ``stability_frequency``, ``stability_frequency_low``,
            ``stability_frequency_high`` and ``stability_shortlist``.

        Raises
        ------
        ValueError
            Other features than those fitted.
        """
        table = self.to_frame()
        if list(adata.var_names) != [str(name) for name in self._names()]:
            raise ValueError("the features of this AnnData are not those fitted")
        for name in VAR_COLUMNS:
            adata.var[f"stability_{name}"] = table[name].to_numpy()

    def _names(self) -> NDArray[Any]:
        default = np.array([f"x{j}" for j in range(self.n_features_in_)], object)
        names: NDArray[Any] = getattr(self, "feature_names_in_", default)
        return names

    def __sklearn_tags__(self) -> Any:
        tags = super().__sklearn_tags__()
        tags.target_tags.required = True
        return tags


def _matrix(X: Any) -> Any:
    """Return an AnnData as a data frame, anything else as it is."""
    return X.to_df() if hasattr(X, "obs") and hasattr(X, "var") else X


def _source(X: NDArray[np.floating[Any]]) -> ArraySource:
    """Return a source whose constant features are left out."""
    source = ArraySource(X)
    source.included[:] = np.ptp(source.base, axis=1) > 0.0
    return source
