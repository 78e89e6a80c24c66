// Package inputs tells which files a job depends on, as one hash.
//
// A run stands for every commit with the same inputs. Two commits with the same
// files under a job's globs would run the same code on the same data, whatever
// else differs between them: documentation, the budgets, other jobs of a
// monorepo, or the way in which a change was merged.
package inputs

import (
	"cmp"
	"context"
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"slices"
	"strings"

	"github.com/bmatcuk/doublestar/v4"
)

// File is one file of a commit.
type File struct {
	Mode string // as git prints it, "100644"
	Path string // from the root of the repository, with slashes
	Blob string // id of the content
}

// Tree is the files of a commit, in any order.
type Tree []File

// Repository reads commits. Commits are named by their full id.
type Repository interface {
	// Tree lists all files of a commit. An error that wraps ErrUnknown says that
	// the repository has no such commit.
	Tree(ctx context.Context, commit string) (Tree, error)
	// Blob reads a file's content.
	Blob(ctx context.Context, f File) ([]byte, error)
	// Meet tells where a head commit left a branch: the branch's tip and the best
	// common ancestor of the two. ref is a branch, or the id of its tip.
	Meet(ctx context.Context, ref, head string) (tip, base string, err error)
}

// ErrUnknown is wrapped where a repository does not have what was asked for.
var ErrUnknown = fmt.Errorf("not in the repository")

// FullID tells whether a name is the full id of a commit. What else a name may
// be, a branch or the start of an id, can mean another commit tomorrow.
func FullID(name string) bool {
	return (len(name) == 40 || len(name) == 64) && strings.Trim(name, "0123456789abcdef") == ""
}

// Hash is the hash over the files that match any of the globs and none of the
// exceptions: SHA-256 over their sorted modes, paths and blob ids. No globs
// mean all files. The globs must be valid.
func (t Tree) Hash(globs, except []string) string {
	sorted := slices.SortedFunc(slices.Values(t), func(a, b File) int { return cmp.Compare(a.Path, b.Path) })
	hash := sha256.New()
	for _, f := range sorted {
		if (len(globs) == 0 || matchesAny(globs, f.Path)) && !matchesAny(except, f.Path) {
			// No part can hold a NUL, so that no two lists hash alike.
			fmt.Fprintf(hash, "%s\x00%s\x00%s\x00", f.Mode, f.Path, f.Blob)
		}
	}
	return hex.EncodeToString(hash.Sum(nil))
}

func matchesAny(globs []string, path string) bool {
	return slices.ContainsFunc(globs, func(g string) bool { return doublestar.MatchUnvalidated(g, path) })
}

// Find is the file at a path; ok is false if there is none.
func (t Tree) Find(path string) (f File, ok bool) {
	i := slices.IndexFunc(t, func(f File) bool { return f.Path == path })
	if i < 0 {
		return f, false
	}
	return t[i], true
}

// Match lists the files that match any of the globs, sorted by path.
func (t Tree) Match(globs ...string) Tree {
	var found Tree
	for _, f := range t {
		if matchesAny(globs, f.Path) {
			found = append(found, f)
		}
	}
	slices.SortFunc(found, func(a, b File) int { return cmp.Compare(a.Path, b.Path) })
	return found
}

// Literal makes a path a glob that matches it alone.
func Literal(path string) string {
	return strings.NewReplacer(`\`, `\\`, "*", `\*`, "?", `\?`, "[", `\[`, "]", `\]`, "{", `\{`, "}", `\}`).Replace(path)
}
