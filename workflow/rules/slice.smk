# The sheet -> rows of one analysis, with arms and SDs settled.
rule slice_rows:
    input:
        key="cache/keys/slice/{analysis}.json",
        sheet=ancient(workflow_side.sheet_files(PLAN)),
    output:
        rows=A + "/slice.parquet",
        ledger=A + "/ledger.parquet",
        derivations=A + "/derivations.parquet",
    run:
        workflow_side.perform(PLAN, f"slice/{wildcards.analysis}")
