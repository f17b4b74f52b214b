# Rows -> effects, variances and covariances as one strategy uses them.
rule fill_spreads:
    input:
        key="cache/keys/sampling/{analysis}/{strategy}.json",
        rows=A + "/slice.parquet",
    output:
        sampling=S + "/sampling.parquet",
        covariance=S + "/covariance.parquet",
        averages=S + "/averages.parquet",
        ledger=S + "/ledger.parquet",
    run:
        workflow_side.perform(
            PLAN, f"sampling/{wildcards.analysis}/{wildcards.strategy}"
        )
