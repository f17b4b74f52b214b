# Rows -> log response ratios from each row's own numbers.
rule compute_effects:
    input:
        key="cache/keys/effects/{analysis}.json",
        rows=A + "/slice.parquet",
    output:
        effects=A + "/effects.parquet",
    run:
        workflow_side.perform(PLAN, f"effects/{wildcards.analysis}")
