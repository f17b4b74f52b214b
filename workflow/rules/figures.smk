# Tables of one analysis -> its charts as SVG, PDF and PNG.
rule draw_figures:
    input:
        key="cache/keys/figures/{analysis}.json",
        results=upstream("figures/{analysis}"),
    output:
        names="cache/figures/{analysis}/list.json",
    run:
        workflow_side.perform(PLAN, f"figures/{wildcards.analysis}")
