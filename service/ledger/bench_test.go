package ledger

import (
	"bytes"
	"fmt"
	"testing"
)

// sampleBody has the shape of a record's body: mostly short names, texts and
// numbers of full length.
func sampleBody(checks int) []byte {
	var b bytes.Buffer
	b.WriteString(`{"checks":[`)
	for i := range checks {
		if i > 0 {
			b.WriteByte(',')
		}
		fmt.Fprintf(&b, `{"allowable":%d.47250361,"compared":false,"demand":86250,"fastener":null,"level":"ultimate","load_case":"LC%d","margin":0.12930231884057963,"mark":"seen","member":"lug","message":null,"method":"elementary@1","mode":"net-section","nominal_margin":null,"row":null,"source":"invented for this benchmark","status":"adequate","unit":"N"}`, 97400+i, i)
	}
	b.WriteString(`],"kind":"lug"}`)
	return b.Bytes()
}

// BenchmarkVerify reads an export without recomputing anything; the rate in
// MB/s is that of one core.
func BenchmarkVerify(b *testing.B) {
	for _, checks := range []int{6, 60} {
		b.Run(fmt.Sprintf("checks=%d", checks), func(b *testing.B) {
			export, key := sampleExport(b, 2000, sampleBody(checks))
			b.SetBytes(int64(len(export)))
			b.ReportAllocs()
			for b.Loop() {
				v := NewVerifier(key)
				if err := v.Export(bytes.NewReader(export), func(Verified) error { return nil }); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

func BenchmarkGrow(b *testing.B) {
	leaves := make([]Hash, 256)
	for i := range leaves {
		leaves[i] = Leaf(fmt.Append(nil, i))
	}
	b.ReportAllocs()
	for b.Loop() {
		if _, _, _, err := Grow(Tree{0, EmptyRoot}, leaves, nil); err != nil {
			b.Fatal(err)
		}
	}
}
