package inputs_test

import (
	"context"
	"errors"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"budgetcheck/budget/inputs"
)

// forked is main with a commit after topic left it.
func forked(t *testing.T) (r *repo, base, tip, head string) {
	r = newRepo(t)
	base = r.commit("a", "1")
	r.run("checkout", "--quiet", "-b", "topic")
	head = r.commit("b", "1")
	r.run("checkout", "--quiet", "main")
	return r, base, r.commit("a", "2"), head
}

func TestMeet(t *testing.T) {
	r, base, tip, head := forked(t)
	for name, clone := range map[string]*repo{"itself": r, "a clone": r.clone(), "of the other branch": r.clone("--branch", "topic"), "bare": r.clone("--bare")} {
		for _, ref := range []string{"main", tip} {
			gotTip, gotBase, err := clone.open().Meet(ctx, ref, head)
			require.NoError(t, err, name)
			assert.Equal(t, []string{tip, base}, []string{gotTip, gotBase}, name)
		}
	}
	gotTip, gotBase, err := r.open().Meet(ctx, "main", tip)
	require.NoError(t, err)
	assert.Equal(t, []string{tip, tip}, []string{gotTip, gotBase}, "a commit meets itself")
}

// The branch is that of the remote: a local one of its name may be old, and a
// tag of its name is no branch.
func TestMeetTheBranchOfTheRemote(t *testing.T) {
	r, base, tip, head := forked(t)
	c := r.clone()
	c.run("update-ref", "refs/heads/main", base)
	c.run("tag", "main", head)
	gotTip, _, err := c.open().Meet(ctx, "main", head)
	require.NoError(t, err)
	assert.Equal(t, tip, gotTip)
	r.run("tag", "main", head)
	gotTip, _, err = r.open().Meet(ctx, "main", head)
	require.NoError(t, err)
	assert.Equal(t, tip, gotTip, "also where there is no remote")
}

func TestMeetNowhere(t *testing.T) {
	r, _, tip, head := forked(t)
	r.run("checkout", "--quiet", "--orphan", "island")
	alone := r.commit("c", "1")
	for _, c := range [][2]string{{"main", alone}, {"gone", head}, {"main", "abababababababababababababababababababab"}} {
		_, _, err := r.open().Meet(ctx, c[0], c[1])
		assert.ErrorIs(t, err, inputs.ErrUnknown, "%v", c)
	}
	// A shallow clone may know an ancestor that is not the best.
	shallow := r.clone("--depth", "1", "--no-single-branch").open()
	_, _, err := shallow.Meet(ctx, tip, head)
	assert.ErrorIs(t, err, inputs.ErrUnknown)
	assert.ErrorContains(t, err, "the clone is shallow")
}

// refusing is a repository that knows nothing.
type refusing struct{ err error }

func (r refusing) Tree(context.Context, string) (inputs.Tree, error)          { return nil, r.err }
func (r refusing) Blob(context.Context, inputs.File) ([]byte, error)          { return nil, r.err }
func (r refusing) Meet(_ context.Context, _, _ string) (_, _ string, _ error) { return "", "", r.err }

// Either asks the next where one does not know, or cannot answer.
func TestEither(t *testing.T) {
	r, base, tip, head := forked(t)
	shallow := r.clone("--depth", "1")
	for name, first := range map[string]inputs.Repository{"shallow": shallow.open(), "unknown": refusing{inputs.ErrUnknown}, "broken": refusing{errors.New("no disk")}} {
		both := inputs.Either{first, r.open()}
		tree, err := both.Tree(ctx, head)
		require.NoError(t, err, name)
		assert.Equal(t, []string{"a", "b"}, paths(tree))
		data, err := both.Blob(ctx, tree[1])
		require.NoError(t, err, name)
		assert.Equal(t, "1", string(data))
		gotTip, gotBase, err := both.Meet(ctx, "main", head)
		require.NoError(t, err, name)
		assert.Equal(t, []string{tip, base}, []string{gotTip, gotBase})
	}
}

func TestEitherAsksNoFurtherThanItMust(t *testing.T) {
	r, _, _, head := forked(t)
	tree, err := inputs.Either{r.open(), refusing{errors.New("it was asked")}}.Tree(ctx, head)
	require.NoError(t, err)
	assert.Len(t, tree, 2)
	_, err = inputs.Either{refusing{errors.New("first")}, refusing{errors.New("last")}}.Tree(ctx, head)
	assert.EqualError(t, err, "last")
	_, err = inputs.Either{}.Tree(ctx, head)
	assert.Error(t, err)
}
