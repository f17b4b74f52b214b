"""What a person can decide about a finding in answers.csv."""

ACCEPT = "accept"
LEAVE_OUT = "leave out"

DECISIONS: dict[str, str] = {
    ACCEPT: "the finding was looked at; for an ask, its stated default holds",
    LEAVE_OUT: "the row leaves the analysis, with the reason in the ledger",
}
