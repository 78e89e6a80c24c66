package unit

import (
	"go/ast"
	"go/importer"
	"go/parser"
	"go/token"
	"go/types"
	"path/filepath"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// pkg is the package as written, ready to be checked with a line added to it.
type pkg struct {
	files *token.FileSet
	trees []*ast.File
	std   types.Importer
}

func parsePackage(t *testing.T) *pkg {
	p := &pkg{files: token.NewFileSet()}
	p.std = importer.ForCompiler(p.files, "source", nil)
	names, err := filepath.Glob("*.go")
	require.NoError(t, err)
	for _, name := range names {
		if strings.HasSuffix(name, "_test.go") {
			continue
		}
		tree, err := parser.ParseFile(p.files, name, nil, 0)
		require.NoError(t, err)
		p.trees = append(p.trees, tree)
	}
	require.NotEmpty(t, p.trees)
	return p
}

// compiles type-checks the package with "var _ = expression" added.
func (p *pkg) compiles(t *testing.T, expression string) error {
	line, err := parser.ParseFile(p.files, "added.go", "package unit\nvar _ = "+expression, 0)
	require.NoError(t, err, expression)
	config := types.Config{Importer: p.std}
	_, err = config.Check("budgetcheck/budget/unit", p.files, append([]*ast.File{line}, p.trees...), nil)
	return err
}

// TestQuantitiesDoNotMix: what a quantity cannot be added to, it is not added
// to. The second half shows that the check would notice if it were.
func TestQuantitiesDoNotMix(t *testing.T) {
	p := parsePackage(t)
	names := []string{"Mass", "Energy", "Joules", "Power", "Intensity", "Share", "Duration"}
	for i, a := range names {
		assert.NoError(t, p.compiles(t, a+"(1) + "+a+"(2)"))
		for _, b := range names[i+1:] {
			assert.ErrorContains(t, p.compiles(t, a+"(1) + "+b+"(2)"), "mismatched types "+a+" and "+b)
		}
	}
	assert.ErrorContains(t, p.compiles(t, "Intensity(1).Of(Joules(1))"), "cannot use Joules(1)")
	assert.NoError(t, p.compiles(t, "Intensity(1).Of(Joules(1).Energy())"))
	assert.ErrorContains(t, p.compiles(t, "Instant(1) - Duration(1)"), "mismatched types Instant and Duration")
}
