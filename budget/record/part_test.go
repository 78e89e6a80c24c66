package record_test

import (
	"fmt"
	"io"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/record"
)

// Parts are counted from 0 or from 1, or have names. A number beyond how many
// there are says that parts are left out.
func TestPartBeyondParts(t *testing.T) {
	for text, fine := range map[string]bool{
		`"part":0`: true, `"part":1`: true, `"part":2,"parts":2`: true, `"part":"left","parts":2`: true,
		`"part":3`: false, `"part":5,"parts":2`: false, `"part":"7","parts":3`: false,
	} {
		line := fmt.Sprintf(`{"k":"open","format":1,"run":"n1","job":"retrain-tide","at":"2031-03-10T02:00:00Z",%s}`, text)
		r, err := record.NewReader(strings.NewReader(line+"\n"), "night.ndjson")
		require.NoError(t, err)
		for err == nil {
			_, err = r.Next()
		}
		require.ErrorIs(t, err, io.EOF)
		assert.Equal(t, fine, r.Findings().Len() == 0, text)
		if !fine {
			assert.Contains(t, r.Findings().First().String(), "write in parts how many parts there are in all")
		}
	}
}
