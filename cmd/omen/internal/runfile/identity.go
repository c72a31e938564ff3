package runfile

import (
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"

	"github.com/pelletier/go-toml/v2"
)

// goals are the keys of [sampling] that say when a run ends, how often it is made
// safe and what is computed beside its chain. The steps of a chain do not depend
// on them.
var goals = []string{"engine", "effective-samples", "max-steps", "max-time", "sync-interval"}

// Identity is the SHA-256, in hexadecimal, of what a resolved run file says a
// chain depends on: all but the goals, [fates], and the paths of the inputs, which have
// hashes of their own. Comments, blanks and the order of keys do not count.
func Identity(text []byte) (string, error) {
	tree := map[string]any{}
	if err := toml.Unmarshal(text, &tree); err != nil {
		return "", explain("", err)
	}
	if sampling, ok := tree["sampling"].(map[string]any); ok {
		for _, key := range goals {
			delete(sampling, key)
		}
	}
	delete(tree, "fates")
	tables, _ := tree["data"].([]any)
	for _, t := range tables {
		if table, ok := t.(map[string]any); ok {
			delete(table, "table")
			delete(table, "covariance")
			delete(table, "templates")
		}
	}
	b, err := json.Marshal(tree) // with its keys in order
	if err != nil {
		return "", err
	}
	sum := sha256.Sum256(b)
	return hex.EncodeToString(sum[:]), nil
}
