package dialect

import "testing"

func TestOursCanBeRead(t *testing.T) {
	all, err := All()
	if err != nil {
		t.Fatal(err)
	}
	for _, d := range all {
		t.Log(d.Head, d.Unchecked())
	}
}
