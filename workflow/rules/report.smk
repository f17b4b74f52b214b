# Everything -> one offline page. What the page shows of the sheet (findings, ledger, labels,
# addresses) stands in the key, and the stage reads it from the stored state of the sheet: the check
# is not above it, so an edited note does not render the page again. An `ancient` check would be
# wrong: the engine does not look at the other inputs of a job below one that runs anyway.
rule render_report:
    input:
        key="cache/keys/report.json",
        results=upstream("report"),
    output:
        page="cache/report/report.html",
    run:
        workflow_side.perform(PLAN, "report")
