// Package instruments holds the nouns and the roles of a bench: what a supply,
// a meter, a scope, a pot and a cutoff promise, and what passes between them
// and a run. It does no I/O; drivers keep the promises.
package instruments

import "context"

// Identity is what an instrument says it is (the four fields of *IDN?).
// Serial is often "0"; Raw is the reply as received.
type Identity struct {
	Maker    string `json:"maker"`
	Model    string `json:"model"`
	Serial   string `json:"serial"`
	Firmware string `json:"firmware"`
	Raw      string `json:"raw"`
}

// String is maker, model and serial, for a person.
func (i Identity) String() string {
	if i.Maker == "" && i.Model == "" {
		return i.Raw
	}
	return i.Maker + " " + i.Model + ", serial " + i.Serial
}

// Identifier tells who answers. It asks the instrument each time.
type Identifier interface {
	Identify(ctx context.Context) (Identity, error)
}
