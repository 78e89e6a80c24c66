package inputs_test

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/inputs"
)

// odd are names that git quotes, splits or escapes where it is asked carelessly.
var odd = []string{"a file.py", "größe.py", "ein\"zitat.py", "zwei\nzeilen.py", "tab\tmitte.py", "潮/汐.csv", "-x", "*", "back\\slash", "tide/[a].py"}

func TestTreeAndBlob(t *testing.T) {
	r := newRepo(t)
	var pairs []string
	for _, name := range odd {
		pairs = append(pairs, name, "content of "+name)
	}
	r.commit(append(pairs, "empty", "")...)
	require.NoError(t, os.Chmod(filepath.Join(r.dir, "a file.py"), 0o777))
	head := r.commit()
	for name, clone := range map[string]*repo{"full": r, "shallow": r.clone("--depth", "1"), "bare": r.clone("--bare")} {
		got := clone.tree(head)
		assert.ElementsMatch(t, append([]string{"empty"}, odd...), paths(got), name)
		for _, path := range odd {
			f, ok := got.Find(path)
			require.True(t, ok, path)
			data, err := clone.open().Blob(ctx, f)
			require.NoError(t, err)
			assert.Equal(t, "content of "+path, string(data))
			assert.Equal(t, map[bool]string{true: "100755", false: "100644"}[path == "a file.py"], f.Mode, path)
		}
		f, _ := got.Find("empty")
		data, err := clone.open().Blob(ctx, f)
		require.NoError(t, err)
		assert.Empty(t, data)
	}
}

// A link and a submodule are inputs by what they point to.
func TestTreeOfLinksAndSubmodules(t *testing.T) {
	r := newRepo(t)
	require.NoError(t, os.Symlink("/harbour/data", filepath.Join(r.dir, "data")))
	there := strings.Repeat("ab", 20)
	r.run("add", "--all")
	r.run("update-index", "--add", "--cacheinfo", "160000,"+there+",vendor/lib")
	r.run("commit", "--quiet", "--message", "links")
	got := r.tree(r.run("rev-parse", "HEAD"))
	link, _ := got.Find("data")
	assert.Equal(t, "120000", link.Mode)
	assert.Contains(t, got, inputs.File{Mode: "160000", Path: "vendor/lib", Blob: there})
	assert.Len(t, got, 2)
}

// The tree is that of the whole repository, wherever the folder lies in it.
func TestTreeFromAFolder(t *testing.T) {
	r := newRepo(t)
	head := r.commit("tide/deep/train.py", "x", "score.py", "y")
	g, err := inputs.OpenGit(ctx, filepath.Join(r.dir, "tide", "deep"))
	require.NoError(t, err)
	got, err := g.Tree(ctx, head)
	require.NoError(t, err)
	assert.ElementsMatch(t, []string{"score.py", "tide/deep/train.py"}, paths(got))
	prefix, err := g.Prefix(ctx)
	require.NoError(t, err)
	assert.Equal(t, "tide/deep", prefix)
	prefix, err = r.open().Prefix(ctx)
	require.NoError(t, err)
	assert.Empty(t, prefix)
}

func TestEmptyTree(t *testing.T) {
	r := newRepo(t)
	assert.Empty(t, r.tree(r.commit()))
}

func TestOpenNoRepository(t *testing.T) {
	_, err := inputs.OpenGit(ctx, t.TempDir())
	assert.ErrorIs(t, err, inputs.ErrUnknown)
	_, err = inputs.OpenGit(ctx, filepath.Join(t.TempDir(), "gone"))
	assert.Error(t, err)
}

func TestUnknownCommits(t *testing.T) {
	r := newRepo(t)
	first := r.commit("a", "1")
	second := r.commit("a", "2")
	none := strings.Repeat("ab", 20)
	_, err := r.open().Tree(ctx, none)
	assert.ErrorIs(t, err, inputs.ErrUnknown)
	assert.ErrorContains(t, err, none)
	_, err = r.open().Blob(ctx, inputs.File{Path: "a", Blob: none})
	assert.ErrorIs(t, err, inputs.ErrUnknown)
	assert.ErrorContains(t, err, "a: ")
	_, err = r.open().Blob(ctx, inputs.File{Path: "a", Blob: second})
	assert.ErrorIs(t, err, inputs.ErrUnknown, "a commit is no file")
	shallow := r.clone("--depth", "1").open()
	_, err = shallow.Tree(ctx, first)
	assert.ErrorIs(t, err, inputs.ErrUnknown)
}

// Names come from records and events: none may be an option or an expression.
func TestHostileNames(t *testing.T) {
	r := newRepo(t)
	head := r.commit("a", "1")
	r.commit("a", "2")
	r.run("checkout", "--quiet", "-b", "topic") // so that @{-1} means something
	g := r.open()
	for _, name := range []string{"", "-x", "--upload-pack=x", "--output=stolen", "a..b", "main..topic", "@{-1}", "HEAD^", "HEAD~1", "main^{tree}", ":/step", "main:a", "HEAD@{0}",
		"a b", "a\nb", "a\x00b", "ref*", "[a]", "back\\slash", head + "^"} {
		_, err := g.Tree(ctx, name)
		assert.ErrorIs(t, err, inputs.ErrUnknown, "%q", name)
		_, err = g.Blob(ctx, inputs.File{Path: "a", Blob: name})
		assert.ErrorIs(t, err, inputs.ErrUnknown, "%q", name)
		_, _, err = g.Meet(ctx, name, head)
		assert.ErrorIs(t, err, inputs.ErrUnknown, "%q", name)
		_, _, err = g.Meet(ctx, "main", name)
		assert.ErrorIs(t, err, inputs.ErrUnknown, "%q", name)
	}
	_, err := os.Stat(filepath.Join(r.dir, "stolen"))
	assert.ErrorIs(t, err, os.ErrNotExist)
}

// What ran in the clone may have left a replacement behind, by which git would
// show its own commit in the place of the one that was asked for.
func TestReplacementsDoNotCount(t *testing.T) {
	r := newRepo(t)
	genuine := r.commit("budgetcheck.toml", "limit = 1")
	forged := r.commit("budgetcheck.toml", "limit = 1000")
	r.run("replace", genuine, forged)
	g, err := inputs.OpenGit(ctx, r.dir)
	require.NoError(t, err)
	tree, err := g.Tree(ctx, genuine)
	require.NoError(t, err)
	data, err := g.Blob(ctx, tree[0])
	require.NoError(t, err)
	assert.Equal(t, "limit = 1", string(data))
}
