"""Invented facts for pages: every number here is drawn or made up, none was measured or fitted.

Estimates are a weighted mean with a round-about interval, so that pictures look plausible; they
are not results of the engine.
"""

from __future__ import annotations

import numpy as np
import pandas as pd

from drystone.report.facts import (
    AnalysisFacts,
    Flow,
    MadeFrom,
    ModelFacts,
    ReportFacts,
    StrategyFacts,
)
from drystone.settings.load import settings_from
from drystone.settings.model import Settings
from drystone.tables import check, effects, results, studies
from drystone.tables.store import conform, empty_table

HOSTILE = (
    "<script>alert('x')</script>",
    'O\'Neill & "Søn" <b>2004</b>',
    '=HYPERLINK("http://example.invalid")',
    "{{ 7 * 7 }} {% raw %}",
    "../../etc/passwd",
    "Straße 1999 \\ \u202e evil",
    "</style><img src=x onerror=alert(1)>",
    '#anchor" onmouseover="alert(1)',
)
REFUSAL = "one row for each study, so study and row cannot be told apart"


def invented_settings() -> Settings:
    return settings_from(
        {
            "sheet": "data/extraction.xlsx",
            "outcomes": {
                "beetle number": {"unit": "per trap"},
                "seed loss": {"unit": "%", "flip_sign": True},
            },
            "analyses": {
                "beetles": {
                    "outcome": "beetle number",
                    "models": {"overall": "~ 1", "path and age": "~ path + age"},
                },
                "seeds": {"outcome": "seed loss", "order": "first"},
            },
            "strategies": ["complete cases", "missing cases", "all cases"],
            "primary": "all cases",
        }
    )


def invented_facts(
    rows: int = 130, *, hostile: bool = False, refuse_main: bool = False, analyses: int = 2
) -> ReportFacts:
    """Facts of a review with ``rows`` usable rows in each analysis."""
    settings = invented_settings()
    made = [
        _analysis(settings, name, rows, seed, hostile=hostile, refuse_main=refuse_main)
        for seed, name in enumerate(list(settings.all_analyses())[:analyses], start=1)
    ]
    ids = {item.name: frozenset(item.slice["row_id"]) for item in made}
    made = [
        AnalysisFacts(
            **{
                **item.__dict__,
                "elsewhere": frozenset().union(*(ids[n] for n in ids if n != item.name)),
            }
        )
        for item in made
    ]
    ledger = _ledger(made)
    left = int(ledger["strategy"].isna().sum())
    names = pd.unique(pd.concat([item.slice["study"] for item in made]))
    return ReportFacts(
        review_name="Invented: gravel paths, beetles & seeds",
        made_from=MadeFrom(
            "2031-invented-0001",
            {"drystone": "0.1.0", "Python": "3.11.7", "NumPy": "2.4.6"},
            {"extraction.xlsx": "0" * 64},
        ),
        settings=settings,
        flow=Flow(rows * len(made) + left, len(names)),
        findings=_findings(made[0]),
        ledger=ledger,
        derivations=_derivations(made[0]),
        studies=_studies(names),
        analyses=tuple(made),
        demo=True,
    )


def study_names(count: int, *, hostile: bool) -> list[str]:
    plain = [f"Invented {chr(65 + i % 26)}{i // 26 or ''} {1990 + i % 35}" for i in range(count)]
    return list(HOSTILE[:count]) + plain[len(HOSTILE[:count]) :] if hostile else plain


def _analysis(
    settings: Settings, name: str, rows: int, seed: int, *, hostile: bool, refuse_main: bool
) -> AnalysisFacts:
    random = np.random.default_rng(seed)
    options = settings.all_analyses()[name]
    table = _slice(random, name, options.outcome[0], rows, hostile=hostile)
    effect = _effects(table)
    made = tuple(
        _strategy(settings, item_name, item, table, effect, options, refuse=refuse_main)
        for item_name, item in settings.all_strategies().items()
    )
    return AnalysisFacts(name, options, table, effect, made, _side_by_side(settings, made))


def _slice(
    random: np.random.Generator, prefix: str, outcome: str, rows: int, *, hostile: bool
) -> pd.DataFrame:
    count = max(3, rows // 4)
    names = study_names(count, hostile=hostile)
    which = np.sort(random.integers(0, count, rows))
    which[:count] = np.arange(count) if rows >= count else which[:count]
    which.sort()
    base = np.exp(random.normal(3, 1.2, rows))
    ratio = np.exp(0.15 + random.normal(0, 0.15, count)[which] + random.normal(0, 0.12, rows))
    table = pd.DataFrame(
        {
            "row_id": [f"{prefix}-{i + 1:04d}" for i in range(rows)],
            "study": [names[i] for i in which],
            "outcome": outcome,
            "unit": "per trap",
            "flip": outcome == "seed loss",
            "sheet": "comparisons",
            "sheet_row": np.arange(rows) + 2,
            "path": random.choice(["gravel", "sand", "bark"], rows),
            "age": random.integers(1, 30, rows).astype(float),
        }
    )
    for arm, mean in (("control", base), ("treatment", base * ratio)):
        table[f"{arm}_arm"] = [f"{row} | {arm}" for row in table["row_id"]]
        table[f"{arm}_mean"] = mean
        cv = np.exp(random.normal(-1.4, 0.45, rows))
        gone = random.random(rows) < 0.22
        table[f"{arm}_sd"] = np.where(gone, np.nan, cv * mean)
        table[f"{arm}_n"] = random.integers(3, 12, rows).astype(float)
        table[f"{arm}_sd_source"] = np.where(gone, "none", "own")
        table[f"{arm}_sd_pooled"] = False
        table[f"{arm}_label"] = HOSTILE[0] if hostile else f"{arm} path"
    # one shared control, to show a covariance and an SD read from another row
    for what in ("arm", "mean", "n", "sd"):
        table.loc[1, f"control_{what}"] = table.loc[0, f"control_{what}"]
    table.loc[[0, 1], "control_sd"] = 0.3 * table.loc[0, "control_mean"]
    table.loc[[0, 1], "control_sd_source"] = ["own", "other row"]
    return table


def _effects(table: pd.DataFrame) -> pd.DataFrame:
    made = table[["row_id", "study"]].copy()
    sign = np.where(table["flip"], -1.0, 1.0)
    first = sign * np.log(table["treatment_mean"] / table["control_mean"])
    made["effect_first"] = first
    for arm in ("control", "treatment"):
        made[f"{arm}_cv"] = table[f"{arm}_sd"] / table[f"{arm}_mean"]
        made[f"{arm}_theta"] = made[f"{arm}_cv"] ** 2 / table[f"{arm}_n"]
        n = table[f"{arm}_n"]
        made[f"{arm}_geary"] = 4 * n**1.5 / (1 + 4 * n) / made[f"{arm}_cv"]
    a, b = made["treatment_theta"], made["control_theta"]
    made["variance_first"] = a + b
    made["effect_second"] = first + sign * (a - b) / 2
    made["variance_second"] = a + b + (a**2 + b**2) / 2
    made["second_order_share"] = 1 - made["variance_first"] / made["variance_second"]
    lowest = made[["control_geary", "treatment_geary"]].min(axis=1, skipna=False)
    made["normal_enough"] = np.where(lowest.isna(), "unknown", np.where(lowest < 3, "fail", "pass"))
    return conform(made, effects.EFFECTS)


def _strategy(settings, name, item, table, effect, options, *, refuse) -> StrategyFacts:
    complete = effect["variance_first"].notna()
    needs = item.use == "complete cases" or item.rows == "complete"
    keep = complete if needs else pd.Series(True, index=effect.index)
    borrow_all = item.use == "all cases"
    sampling = _sampling(table[keep], effect[keep], borrow_all)
    covariance = conform(
        pd.DataFrame(
            {
                "row_id": sampling["row_id"].iloc[:1],
                "other_row_id": sampling["row_id"].iloc[1:2].to_numpy(),
                "covariance": 0.001,
            }
        ),
        effects.COVARIANCE,
    )
    averages = empty_table(effects.AVERAGES) if item.use == "complete cases" else _averages(options)
    refuse_this = refuse and name == settings.primary
    models = tuple(
        _model(model, formula, sampling, item, refuse=refuse_this or _refuses(model, item))
        for model, formula in options.models.items()
    )
    return StrategyFacts(name, item, sampling, covariance, averages, models)


def _refuses(model: str, item) -> bool:
    return model == "path and age" and item.use == "complete cases"


def _sampling(table: pd.DataFrame, effect: pd.DataFrame, borrow_all: bool) -> pd.DataFrame:
    made = effect[["row_id", "study"]].copy()
    made["effect"] = effect["effect_first"]
    total = np.zeros(len(made))
    for arm in ("control", "treatment"):
        own = effect[f"{arm}_cv"]
        cv2 = pd.Series(0.06, index=own.index) if borrow_all else (own**2).fillna(0.06)
        made[f"{arm}_cv2"] = cv2
        made[f"{arm}_cv_source"] = (
            "average" if borrow_all else np.where(own.isna(), "average", "own")
        )
        total = total + (cv2 / table[f"{arm}_n"]).to_numpy()
    made["sampling_variance"] = total
    return conform(made, effects.SAMPLING)


def _averages(options) -> pd.DataFrame:
    rows = []
    for arm, share in (("control", 0.31), ("treatment", 0.12)):
        for version, cv2 in (("square of mean", 0.061), ("mean of squares", 0.097)):
            rows.append(
                {
                    "outcome": options.outcome[0],
                    "arm": arm,
                    "version": version,
                    "cv2": cv2,
                    "reporting_arms": 24,
                    "used": version == "square of mean",
                    "pooled_because": None,
                    "largest_share": share,
                    "largest_arm": f"beetles-0003 | {arm}",
                }
            )
    return conform(pd.DataFrame(rows), effects.AVERAGES)


def _model(name, formula, sampling, item, *, refuse) -> ModelFacts:
    if refuse:
        return ModelFacts(
            name,
            formula,
            _coefficients([_refused()]),
            empty_table(results.COMPONENTS),
            empty_table(results.HETEROGENEITY),
        )
    weights = 1 / (sampling["sampling_variance"] + 0.03)
    mean = float((weights * sampling["effect"]).sum() / weights.sum())
    count = sampling["study"].nunique()
    se = 0.25 / np.sqrt(count) * (1.15 if item.use == "complete cases" else 1.0)
    names = (
        ["overall"] if formula == "~ 1" else ["intercept", "path = gravel", "path = sand", "age"]
    )
    rows = [
        _coefficient(word, mean * 0.6**i, se * 0.9**i, sampling, count)
        for i, word in enumerate(names)
    ]
    components = pd.DataFrame(
        {
            "level": ["study", "row"],
            "variance": [0.021, 0.014 if item.use != "complete cases" else 0.0],
            "at_zero": [False, item.use == "complete cases"],
            "i2": [0.42, 0.27 if item.use != "complete cases" else 0.0],
        }
    )
    heterogeneity = pd.DataFrame(
        {
            "q": [len(sampling) * 1.9],
            "q_df": [len(sampling) - len(names)],
            "q_p": [0.00002],
            "typical_variance": [0.0151],
            "i2_total": [0.69],
            "cvh": [1.24],
            "m": [0.55],
            "r2_marginal": [np.nan if formula == "~ 1" else 0.18],
            "r2_conditional": [np.nan if formula == "~ 1" else 0.61],
        }
    )
    return ModelFacts(
        name,
        formula,
        _coefficients(rows),
        conform(components, results.COMPONENTS),
        conform(heterogeneity, results.HETEROGENEITY),
    )


def _coefficient(word, mean, se, sampling, count) -> dict:
    df = max(count - 1.4, 1.2)
    reach, predicted = 2.05 * se, 2.05 * np.sqrt(se**2 + 0.035)
    return {
        "coefficient": word,
        "estimate": mean,
        "se": se,
        "df": df,
        "ci_low": mean - reach,
        "ci_high": mean + reach,
        "p": 0.012,
        "se_model": se * 0.9,
        "df_model": count - 1.0,
        "ci_low_model": mean - 0.9 * reach,
        "ci_high_model": mean + 0.9 * reach,
        "pi_low": mean - predicted if word == "overall" else np.nan,
        "pi_high": mean + predicted if word == "overall" else np.nan,
        "rows": len(sampling),
        "studies": count,
        "log_likelihood": -12.3456,
        "refused": None,
        "warnings": None,
    }


def _refused() -> dict:
    numbers = dict.fromkeys(results.COEFFICIENTS.columns, np.nan)
    return {
        **numbers,
        "coefficient": "overall",
        "rows": 0,
        "studies": 0,
        "refused": REFUSAL,
        "warnings": None,
    }


def _coefficients(rows: list[dict]) -> pd.DataFrame:
    return conform(pd.DataFrame(rows), results.COEFFICIENTS)


def _side_by_side(settings: Settings, made: tuple[StrategyFacts, ...]) -> pd.DataFrame:
    rows = []
    for strategy in made:
        for model in strategy.models:
            for item in model.coefficients.to_dict("records"):
                copied = {name: item[name] for name in results.SIDE_BY_SIDE.columns if name in item}
                refused = isinstance(item["refused"], str)
                sign = None if refused else "positive" if item["estimate"] > 0 else "negative"
                apart = item["ci_low"] > 0 or item["ci_high"] < 0
                rows.append(
                    copied
                    | {
                        "strategy": strategy.name,
                        "row_set": "rows with both SDs"
                        if "complete" in (strategy.settings.use[:8], strategy.settings.rows)
                        else "all usable rows",
                        "model": model.name,
                        "sign": sign,
                        "excludes_zero": None if refused else "yes" if apart else "no",
                        "primary": strategy.name == settings.primary,
                    }
                )
    return conform(pd.DataFrame(rows), results.SIDE_BY_SIDE)


def _ledger(made: list[AnalysisFacts]) -> pd.DataFrame:
    rows = [
        _entry(None, None, f"gone-{i}", "no n", "the control arm has no n", i) for i in range(3)
    ]
    rows.append(_entry(None, None, "gone-9", "mean not positive", "the treatment mean is 0", 9))
    for item in made:
        for strategy in item.strategies:
            kept = set(strategy.sampling["row_id"])
            for row in item.slice["row_id"]:
                if row not in kept:
                    text = "an arm has no SD"
                    rows.append(_entry(item.name, strategy.name, row, "no SD", text, 0))
    return conform(pd.DataFrame(rows), check.LEDGER)


def _entry(analysis, strategy, row, rule, reason, sheet_row) -> dict:
    return {
        "analysis": analysis,
        "strategy": strategy,
        "model": None,
        "row_id": row,
        "study": "Invented",
        "sheet": "comparisons",
        "sheet_row": sheet_row,
        "rule": rule,
        "reason": reason,
    }


def _findings(item: AnalysisFacts) -> pd.DataFrame:
    rows = []
    levels = ("stop", "ask", "warn", "fixed")
    for position, row in enumerate(item.slice["row_id"].iloc[:12]):
        rows.append(
            {
                "level": levels[position % 4],
                "rule": f"rule {position % 4}",
                "sheet": "comparisons",
                "cell": f"K{position + 2}",
                "row_id": row,
                "column": "control_sd",
                "value": HOSTILE[position % len(HOSTILE)],
                "wrong": "the SD is larger than the mean",
                "todo": "look at the table in the paper",
            }
        )
    return conform(pd.DataFrame(rows), check.FINDINGS)


def _derivations(item: AnalysisFacts) -> pd.DataFrame:
    rows = [
        {
            "row_id": row,
            "study": study,
            "arm": "control",
            "sd": 1.234,
            "rule": "SE times root n",
            "inputs": f"K{i + 2} = 0.5, L{i + 2} = 6",
            "assumptions": "n counts replicates",
        }
        for i, (row, study) in enumerate(
            zip(item.slice["row_id"].iloc[:6], item.slice["study"], strict=False)
        )
    ]
    return conform(pd.DataFrame(rows), check.DERIVATIONS)


def _studies(names) -> pd.DataFrame:
    table = pd.DataFrame({"study": names})
    table["citation"] = [f"{name}. Journal of Things that Never Were." for name in names]
    table["year"] = [1990.0 + i % 35 for i in range(len(names))]
    table["doi"], table["status"], table["note"] = None, "in", None
    return conform(table, studies.SCHEMA)
