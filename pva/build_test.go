package pva

import "testing"

func TestKeyTableReachesEveryField(t *testing.T) {
	for _, k := range Keys() {
		pos := make([]int, 3)
		if k.At(new(Case), pos...) == nil {
			t.Errorf("%s: no field", k.Path)
		}
	}
}
