# Names of analyses, strategies and models are folders; none of them holds a slash.
wildcard_constraints:
    analysis="[^/]+",
    strategy="[^/]+",
    model="[^/]+",


A = "cache/analyses/{analysis}"
S = A + "/{strategy}"
M = S + "/{model}"


def upstream(pattern):
    """Files of all steps above the step that the pattern names, for this job's wildcards."""
    return lambda wildcards: workflow_side.upstream(PLAN, pattern.format(**wildcards))
