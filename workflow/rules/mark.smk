# The sheet -> its copy with every doubtful cell coloured and explained.
rule mark_sheet:
    input:
        key="cache/keys/mark.json",
        sheet=ancient(workflow_side.sheet_files(PLAN)),
    output:
        marked="cache/check/marked.xlsx",
    run:
        workflow_side.perform(PLAN, "mark")
