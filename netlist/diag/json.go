package diag

import "encoding/json"

type placeJSON struct {
	Line   int `json:"line"`
	Column int `json:"column"`
}

type relatedJSON struct {
	File    string    `json:"file"`
	Line    int       `json:"line"`
	Column  int       `json:"column"`
	End     placeJSON `json:"end"`
	Message string    `json:"message"`
}

type diagnosticJSON struct {
	File     string        `json:"file"`
	Line     int           `json:"line"`
	Column   int           `json:"column"`
	End      placeJSON     `json:"end"`
	Code     string        `json:"code"`
	Severity string        `json:"severity"`
	Message  string        `json:"message"`
	Hint     string        `json:"hint"`
	Related  []relatedJSON `json:"related"`
}

// MarshalJSON gives an object with file, line, column, end {line, column}, code,
// severity, message, hint and related, in this order, every key always present.
// Line and column are 0 where there is no place. A column is one code point.
func (d Diagnostic) MarshalJSON() ([]byte, error) {
	related := make([]relatedJSON, len(d.Related))
	for i, r := range d.Related {
		related[i] = relatedJSON{r.Span.File, r.Span.Start.Line, r.Span.Start.Column, placeJSON{r.Span.End.Line, r.Span.End.Column}, r.Message}
	}
	s := d.Span
	return json.Marshal(diagnosticJSON{
		File: s.File, Line: s.Start.Line, Column: s.Start.Column, End: placeJSON{s.End.Line, s.End.Column},
		Code: d.Code, Severity: d.Severity.String(), Message: d.Message, Hint: d.Hint, Related: related,
	})
}
