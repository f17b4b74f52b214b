# All fits of an analysis -> strategies side by side.
rule compare_strategies:
    input:
        key="cache/keys/compare/{analysis}.json",
        fits=upstream("compare/{analysis}"),
    output:
        table=A + "/side_by_side.parquet",
    run:
        workflow_side.perform(PLAN, f"compare/{wildcards.analysis}")
