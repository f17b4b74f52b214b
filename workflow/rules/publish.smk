# The cache -> results/, replaced as a whole once everything above has succeeded.
rule publish_results:
    input:
        key="cache/keys/publish.json",
        made=upstream("publish"),
    output:
        stamp="cache/published.json",
    run:
        workflow_side.perform(PLAN, "publish")
