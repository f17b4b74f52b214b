# Effects and covariances -> one model's results.
rule fit_model:
    input:
        key="cache/keys/fit/{analysis}/{strategy}/{model}.json",
        rows=A + "/slice.parquet",
        sampling=S + "/sampling.parquet",
        covariance=S + "/covariance.parquet",
    output:
        coefficients=M + "/coefficients.parquet",
        components=M + "/components.parquet",
        heterogeneity=M + "/heterogeneity.parquet",
        ledger=M + "/ledger.parquet",
    run:
        workflow_side.perform(
            PLAN, f"fit/{wildcards.analysis}/{wildcards.strategy}/{wildcards.model}"
        )
