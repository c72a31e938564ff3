package report

import (
	"encoding/json"
	"io"

	"omen/cmd/omen/internal/result"
)

// JSON writes summary.json.
func JSON(w io.Writer, s *result.Summary) error {
	enc := json.NewEncoder(w)
	enc.SetIndent("", "  ")
	enc.SetEscapeHTML(false)
	return enc.Encode(s)
}
