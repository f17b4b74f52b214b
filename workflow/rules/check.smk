# The sheet -> findings, accepted findings, ledger, derivations, studies.
rule check_sheet:
    input:
        key="cache/keys/check.json",
        sheet=ancient(workflow_side.sheet_files(PLAN)),
    output:
        findings="cache/check/findings.parquet",
        accepted="cache/check/accepted.parquet",
        ledger="cache/check/ledger.parquet",
        derivations="cache/check/derivations.parquet",
        studies="cache/check/studies.parquet",
    run:
        workflow_side.perform(PLAN, "check")
