"""What the models say."""

from drystone.tables.columns import flag, number, schema, text, whole

COEFFICIENTS = schema(
    "coefficients",
    "one coefficient of one model; a refused model has one row with its reason",
    {
        "coefficient": text("name; the intercept alone is 'overall'", required=True),
        "estimate": number("estimate on the log scale"),
        "se": number("standard error that the interval uses"),
        "df": number("degrees of freedom that the interval uses"),
        "ci_low": number("lower limit"),
        "ci_high": number("upper limit"),
        "p": number("two-sided p value"),
        "se_model": number("model-based standard error"),
        "df_model": number("degrees of freedom beside it"),
        "ci_low_model": number("model-based lower limit"),
        "ci_high_model": number("model-based upper limit"),
        "pi_low": number("lower prediction limit, a new effect in a new study"),
        "pi_high": number("upper prediction limit"),
        "rows": whole("rows in the fit"),
        "studies": whole("studies in the fit"),
        "log_likelihood": number("restricted (REML) or full (ML) log-likelihood"),
        "refused": text("why there is no result; blank when there is one"),
        "warnings": text("sentences about this fit, separated by line breaks"),
    },
)

COMPONENTS = schema(
    "components",
    "one variance component of one model",
    {
        "level": text("level of dependence", required=True),
        "variance": number("variance between units of this level", required=True),
        "at_zero": flag("True when the estimate is exactly zero"),
        "i2": number("share of the total variance, given the sampling variances"),
    },
)

HETEROGENEITY = schema(
    "heterogeneity",
    "one model",
    {
        "q": number("weighted sum of squares around the model"),
        "q_df": number("its degrees of freedom"),
        "q_p": number("its p value under no heterogeneity"),
        "typical_variance": number("typical sampling variance"),
        "i2_total": number("share of variance not due to sampling"),
        "cvh": number("total heterogeneity SD / |overall|"),
        "m": number("total heterogeneity SD / (SD + |overall|)"),
        "r2_marginal": number("share of variance explained by moderators"),
        "r2_conditional": number("the same with the study level"),
    },
)

SIDE_BY_SIDE = schema(
    "side_by_side",
    "one coefficient of one model under one strategy",
    {
        "strategy": text("strategy", required=True),
        "row_set": text("which rows: all usable, or those with both SDs", required=True),
        "model": text("model", required=True),
        "coefficient": text("coefficient", required=True),
        "rows": whole("rows in the fit"),
        "studies": whole("studies in the fit"),
        "estimate": number("estimate on the log scale"),
        "ci_low": number("lower limit"),
        "ci_high": number("upper limit"),
        "sign": text("positive, negative or none"),
        "excludes_zero": text("yes, no, or blank when refused"),
        "refused": text("why there is no result"),
        "primary": flag("True for the strategy that the team declared as the main one"),
    },
)
