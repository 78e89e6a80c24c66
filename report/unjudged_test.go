package report

import (
	"strings"
	"testing"

	"github.com/stretchr/testify/require"
	"github.com/yuin/goldmark/ast"
)

func TestUnjudged(t *testing.T) {
	var b strings.Builder
	require.NoError(t, Unjudged(&b, "the policy cannot be used:\nbudgetcheck.toml:3: unknown key\n"))
	require.Equal(t, "**Gate unknown:** this change could not be judged.\n\n- `the policy cannot be used:`\n- `budgetcheck.toml:3: unknown key`\n\n"+Caution+"\n", b.String())
}

func TestWhyNothingWasJudgedIsInert(t *testing.T) {
	for _, text := range hostile() {
		var b strings.Builder
		require.NoError(t, Unjudged(&b, text))
		for n, in := range walk(t, b.String()) {
			switch n.Kind() {
			case ast.KindRawHTML, ast.KindHTMLBlock, ast.KindLink, ast.KindAutoLink, ast.KindImage, ast.KindFencedCodeBlock, ast.KindHeading:
				require.Failf(t, "not inert", "%s in\n%s", n.Kind(), b.String())
			}
			if outside(n) {
				requireHarmless(t, string(n.(*ast.Text).Value(in)))
			}
		}
	}
}
