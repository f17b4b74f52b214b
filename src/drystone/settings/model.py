"""The config, typed: what a team may say, with defaults and descriptions.

This is the only place where an option is defined; the option table and the JSON Schema are made
from it.
"""

from __future__ import annotations

from typing import Any, Literal

from pydantic import BaseModel, ConfigDict, Field, field_validator, model_validator

from drystone.settings.formulas import check_formula
from drystone.settings.names import check_distinct, check_name
from drystone.settings.problems import nearest
from drystone.words import scales, spreads, strategies


class Part(BaseModel):
    """Base of all parts: unknown keys are refused, values are never guessed across types."""

    model_config = ConfigDict(extra="forbid", frozen=True, strict=True)


class Defaults(Part):
    """What holds for columns that the sheet does not have, and for blank cells in them."""

    spread_kind: Literal[
        "SD", "SE", "CI", "CI (z)", "variance", "CV%", "IQR", "range", "unlabelled"
    ] = Field("SD", description="what a spread is when its kind is not typed")
    centre_kind: Literal["mean", "median", "geometric mean", "mean of logs", "mean of log10"] = (
        Field("mean", description="what the typed centre is; logs are natural ones unless named")
    )
    design: str = Field("independent", description="design of the comparison")
    n_meaning: Literal["replicate", "subsample", "individual"] = Field(
        "replicate", description="what n counts"
    )

    @field_validator("design")
    @classmethod
    def _known_design(cls, value: str) -> str:
        for word in value.split(","):
            if word.strip() not in spreads.DESIGNS:
                raise ValueError(f"'{word.strip()}': {nearest(word.strip(), spreads.DESIGNS)}")
        return value


class Layout(Part):
    """Where the table of comparisons stands in the team's file, when it is not at the top."""

    sheet: str | None = Field(
        None, description="sheet of the workbook, or file of the folder, that holds the comparisons"
    )
    header_row: int | None = Field(
        None, ge=1, description="row of the sheet where the headers begin; the first filled one"
    )
    header_rows: int = Field(
        1, ge=1, le=5, description="number of header lines; their texts are joined by a space"
    )


class Outcome(Part):
    """One outcome: its unit, its scale, its direction."""

    unit: str | None = Field(None, description="unit that every row of this outcome must have")
    scale: Literal["ratio", "interval", "bounded", "count"] = Field(
        "ratio", description="a log response ratio needs a ratio scale: a true zero, no upper bound"
    )
    flip_sign: bool = Field(
        False, description="true when smaller is better: the effect's sign is turned, and shown"
    )


class Analysis(Part):
    """One question to the sheet."""

    outcome: tuple[str, ...] = Field(description="one outcome or a list of outcomes")
    where: dict[str, tuple[str, ...]] = Field(
        default_factory=dict, description="keep only rows whose column holds one of these values"
    )
    where_not: dict[str, tuple[str, ...]] = Field(
        default_factory=dict, description="leave out rows whose column holds one of these values"
    )
    effect: Literal["log response ratio"] = Field(
        "log response ratio", description="what is computed from each comparison"
    )
    order: Literal["first", "second"] = Field(
        "second", description="estimator and variance of the log response ratio"
    )
    models: dict[str, str] = Field(
        default_factory=lambda: {"overall": "~ 1"},
        description="models by name, as formulas of the sheet's columns: '~ 1', '~ crop + depth'",
    )
    levels: tuple[Literal["study", "row"], ...] = Field(
        ("study", "row"), description="levels of dependence that get a variance component"
    )
    shared_controls: Literal["covariance", "ignore"] = Field(
        "covariance", description="whether rows that share an arm get a sampling covariance"
    )

    @field_validator("outcome", mode="before")
    @classmethod
    def _outcome_list(cls, value: Any) -> Any:
        if value == []:
            raise ValueError("needs at least one outcome")
        return _text_list(value)

    @field_validator("where", "where_not", mode="before")
    @classmethod
    def _filter_lists(cls, value: Any) -> Any:
        if not isinstance(value, dict):
            return value
        return {key: _text_list(item) for key, item in value.items()}

    @field_validator("levels", mode="before")
    @classmethod
    def _level_list(cls, value: Any) -> Any:
        levels = _text_list(value)
        if isinstance(levels, tuple) and len(set(levels)) != len(levels):
            raise ValueError("names a level twice")
        return levels

    @field_validator("models")
    @classmethod
    def _models(cls, value: dict[str, str]) -> dict[str, str]:
        if not value:
            raise ValueError("needs at least one model, for example overall: '~ 1'")
        check_distinct(value, "model")
        return {check_name(name, "model"): check_formula(text) for name, text in value.items()}


class Strategy(Part):
    """One way to treat missing spreads, under a name."""

    name: str = Field(description="name that results carry")
    use: Literal["complete cases", "missing cases", "all cases"] = Field(
        description="which strategy"
    )
    average_cv: Literal["square of mean", "mean of squares"] = Field(
        "square of mean",
        description="square of the n-weighted mean CV, or n-weighted mean of the squared CVs",
    )
    average_over: Literal["each arm", "both arms"] = Field(
        "each arm", description="one average for each arm, or one for both arms together"
    )
    rows: Literal["all", "complete"] = Field(
        "all", description="all usable rows, or only those that report both SDs"
    )


class Inference(Part):
    """How sure: intervals and estimator."""

    interval: Literal["cluster robust", "model based"] = Field(
        "cluster robust", description="standard errors of the main interval"
    )
    cluster: Literal["study"] = Field("study", description="unit that errors are shared within")
    confidence_percent: float = Field(95.0, gt=50, lt=100, description="level of all intervals")
    estimator: Literal["REML", "ML"] = Field("REML", description="likelihood that is maximised")

    @field_validator("confidence_percent", mode="before")
    @classmethod
    def _as_float(cls, value: Any) -> Any:
        return float(value) if isinstance(value, int) and not isinstance(value, bool) else value


class Settings(Part):
    """The whole config of a review."""

    sheet: str = Field(
        description="the extraction sheet: .xlsx or .ods, a .csv file, or a folder of CSV files"
    )
    title: str = Field("", description="name of the review, as the report prints it")
    invented: bool = Field(
        False, description="true when the data are made up; the report then says so at its top"
    )
    columns: dict[str, str] = Field(
        default_factory=dict, description="the team's column names, as ours: theirs"
    )
    layout: Layout = Field(
        default_factory=lambda: Layout(), description="where the comparisons stand in the file"
    )
    defaults: Defaults = Field(
        default_factory=lambda: Defaults(), description="values for absent columns"
    )
    outcomes: dict[str, Outcome] = Field(description="the outcomes, by the name in the sheet")
    analyses: dict[str, Analysis] = Field(
        default_factory=dict, description="questions; when absent, one for each outcome"
    )
    strategies: tuple[Strategy, ...] = Field(
        default_factory=lambda: tuple(
            Strategy(name=name, use=name)  # type: ignore[arg-type]
            for name in strategies.STRATEGIES
        ),
        description="ways to treat missing spreads, side by side",
    )
    primary: str = Field("all cases", description="the strategy that the team reports first")
    inference: Inference = Field(
        default_factory=lambda: Inference(), description="intervals and estimator"
    )
    missing_n: Literal["leave", "study minimum", "outcome median"] = Field(
        "leave", description="rows without n leave, or borrow a stated n and are flagged"
    )
    zero_sd: Literal["missing", "as typed"] = Field(
        "missing",
        description="an SD of zero counts as missing; 'as typed' keeps it where the other arm "
        "varies, for repeating published numbers",
    )

    @field_validator("outcomes", mode="before")
    @classmethod
    def _outcomes(cls, value: Any) -> Any:
        if isinstance(value, dict):
            if not value:
                raise ValueError("needs at least one outcome")
            return {name: {} if item is None else item for name, item in value.items()}
        return value

    @field_validator("strategies", mode="before")
    @classmethod
    def _strategies(cls, value: Any) -> Any:
        return tuple(_strategy(item) for item in value) if isinstance(value, list) else value

    @model_validator(mode="after")
    def _hangs_together(self) -> Settings:
        _check_strategies(self)
        _check_analyses(self)
        return self

    def all_analyses(self) -> dict[str, Analysis]:
        """Analyses as declared, or one for each ratio-scale outcome under the outcome's name."""
        if self.analyses:
            return dict(self.analyses)
        ratio = [name for name, item in self.outcomes.items() if item.scale == scales.RATIO]
        return {folder_name(name): Analysis(outcome=(name,)) for name in ratio}

    def all_strategies(self) -> dict[str, Strategy]:
        """Strategies by name, with every all-cases strategy also on the complete rows."""
        found: dict[str, Strategy] = {}
        for strategy in self.strategies:
            found[strategy.name] = strategy
            if strategy.use == strategies.ALL_CASES and strategy.rows == strategies.ALL_ROWS:
                twin = f"{strategy.name} on complete rows"
                found[twin] = strategy.model_copy(update={"name": twin, "rows": "complete"})
        return found


def folder_name(outcome: str) -> str:
    """Outcome name with every character that a folder cannot hold turned into a dash."""
    kept = "".join(c if c.isalnum() or c in " -._" else "-" for c in outcome).strip(" .-_")
    return kept[:60].strip(" .") or "analysis"


def _text_list(value: Any) -> Any:
    items = value if isinstance(value, list | tuple) else [value]
    return tuple(
        f"{item:g}" if isinstance(item, int | float) and not isinstance(item, bool) else item
        for item in items
    )


def _strategy(item: Any) -> Any:
    if isinstance(item, str):
        return {"name": item, "use": item}
    if isinstance(item, dict) and len(item) == 1 and "use" not in item and "name" not in item:
        name, options = next(iter(item.items()))
        given = options or {}
        fixed = [key for key in ("name", "use") if key in given] if isinstance(given, dict) else []
        if not isinstance(given, dict) or fixed:
            raise ValueError(
                f"'{name}' holds {fixed or given!r}; to give a strategy a name of its own write "
                f"{{name: ..., use: {name}}}"
            )
        return {"name": name, "use": name, **given}
    return item


def _check_strategies(settings: Settings) -> None:
    if not settings.strategies:
        raise ValueError("strategies: name at least one")
    for strategy in settings.strategies:
        check_name(strategy.name, "strategy")
    names = list(settings.all_strategies())
    declared = [strategy.name for strategy in settings.strategies]
    check_distinct(declared, "strategy")
    check_distinct(names, "strategy")
    if settings.primary not in declared:
        if "primary" in settings.model_fields_set:
            raise ValueError(f"primary '{settings.primary}': {nearest(settings.primary, declared)}")
        object.__setattr__(settings, "primary", declared[0])


def _check_analyses(settings: Settings) -> None:
    for name, analysis in settings.analyses.items():
        check_name(name, "analysis")
        for outcome in analysis.outcome:
            if outcome not in settings.outcomes:
                raise ValueError(
                    f"analysis '{name}' asks for outcome '{outcome}': "
                    f"{nearest(outcome, settings.outcomes)}"
                )
    check_distinct(settings.all_analyses(), "analysis")
    if not settings.all_analyses():
        raise ValueError(
            "no outcome has a ratio scale, so there is nothing to analyse: a log response ratio "
            "needs a true zero and no upper bound"
        )
