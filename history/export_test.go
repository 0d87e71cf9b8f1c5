package history

// What tests ask by itself.
var (
	AssessmentOf = assessmentOf
	SignedRows   = signedRows
	Findings     = statedFindings
)
