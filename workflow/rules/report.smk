# Everything -> one offline page and its figures. What the page shows of the check stands in the key,
# so the check's own files are ancient: an edited note does not render the page again.
rule render_report:
    input:
        key="cache/keys/report.json",
        check=ancient(workflow_side.outputs(PLAN, "check")),
        results=upstream("report"),
    output:
        page="cache/report/report.html",
    run:
        workflow_side.perform(PLAN, "report")
