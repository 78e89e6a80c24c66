package ledger

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"net/url"
	"os"
	"path/filepath"
	"slices"
	"strings"
)

// setting is one of git's settings.
type setting struct{ scope, key, value string }

// openGitIn opens a ledger as it is seen from a folder.
func openGitIn(ctx context.Context, dir, where string) (*gitStore, error) {
	s := &gitStore{name: "git:" + redact(where), branch: where, env: outside(os.Environ())}
	address := ""
	if n := strings.LastIndexByte(where, '#'); n >= 0 {
		address, s.branch = where[:n], where[n+1:]
	}
	here := &repo{store: s, dir: dir}
	if _, err := here.run(ctx, nil, "check-ref-format", "refs/heads/"+s.branch); err != nil {
		return nil, fmt.Errorf("%q is no name of a branch; write git:BRANCH or git:REMOTE#BRANCH: %w", s.branch, err)
	}
	all, err := here.settings(ctx)
	if err != nil {
		return nil, err
	}
	clone, err := here.clone(ctx)
	if err == nil {
		err = s.find(dir, address, clone, all)
	}
	if err != nil {
		return nil, fmt.Errorf("open the ledger %s: %w", s.name, err)
	}
	s.identify(all)
	return s, nil
}

// find settles where the branch is, and where our repository is kept.
func (s *gitStore) find(dir, address, clone string, all []setting) error {
	name := address
	if name == "" {
		name = "origin"
	}
	known := last(all, "remote."+name+".url") != ""
	switch {
	case clone == "" && address == "":
		return errors.New("this folder is in no clone; change into one, or write git:REMOTE#BRANCH with the address of a repository")
	case address == "" && !known: // a clone without a remote
		s.home, s.ref = clone, "refs/heads/"+s.branch
		return nil
	case known:
		s.remote = last(all, "remote."+name+".url")
		s.set = concerning(all, name)
	case strings.ContainsAny(address, `/\:`):
		s.remote = address
		s.set = concerning(all, "")
	default:
		return fmt.Errorf("there is no remote %q here; write the name of a remote, or the address of a repository", address)
	}
	s.remote = absolute(dir, s.remote)
	s.ref = "refs/budgetcheck/" + s.branch
	s.home = home(clone, s.remote)
	return nil
}

// absolute makes the path of a folder absolute, for git runs in another one.
func absolute(dir, address string) string {
	path := address
	if !filepath.IsAbs(path) {
		path = filepath.Join(dir, path)
	}
	if _, err := os.Stat(path); err != nil {
		return address // a URL
	}
	if full, err := filepath.Abs(path); err == nil {
		return full
	}
	return address
}

// home is where what is fetched from an address is kept: within the clone's own
// git folder, or with the user's caches.
func home(clone, address string) string {
	base := clone
	if base == "" {
		base = os.TempDir()
		if cache, err := os.UserCacheDir(); err == nil {
			base = cache
		}
	}
	sum := sha256.Sum256([]byte(redact(address)))
	const enough = 12
	return filepath.Join(base, "budgetcheck", hex.EncodeToString(sum[:enough]))
}

// clone is the git folder of the clone that a folder is in, "" if it is in
// none.
func (r *repo) clone(ctx context.Context) (string, error) {
	out, err := r.run(ctx, nil, "rev-parse", "--git-common-dir")
	var said *complaint
	switch {
	case errors.As(err, &said) && strings.Contains(said.text, "not a git repository"):
		return "", nil
	case err != nil:
		return "", err
	}
	path := strings.TrimSuffix(string(out), "\n")
	if !filepath.IsAbs(path) {
		path = filepath.Join(r.dir, path)
	}
	return filepath.Abs(path)
}

// settings are all that hold in a folder, the ones that win last.
func (r *repo) settings(ctx context.Context) (all []setting, err error) {
	out, err := r.run(ctx, nil, "config", "--list", "-z", "--show-scope", "--includes")
	if err != nil {
		return nil, err
	}
	fields := strings.Split(string(out), "\x00")
	for n := 0; n+1 < len(fields); n += 2 {
		key, value, _ := strings.Cut(fields[n+1], "\n")
		all = append(all, setting{fields[n], key, value})
	}
	return all, nil
}

// last is the value of a setting that wins; "" if it is not set.
func last(all []setting, key string) (value string) {
	for _, s := range all {
		if s.key == key {
			value = s.value
		}
	}
	return value
}

// concerning are the clone's own settings of how to reach a remote, which our
// repository would not see otherwise: tokens, keys, proxies, other addresses.
func concerning(all []setting, remote string) (some []setting) {
	prefixes := []string{"http.", "https.", "credential.", "url.", "ssh.", "protocol.", "user.", "author.", "committer.",
		"core.sshcommand", "core.askpass", "core.gitproxy"}
	for _, s := range all {
		own := s.scope == "local" || s.scope == "worktree"
		if key, ok := strings.CutPrefix(s.key, "remote."+remote+"."); ok && slices.Contains([]string{"pushurl", "proxy", "uploadpack", "receivepack"}, key) {
			some = append(some, setting{key: "remote." + ours + "." + key, value: s.value})
		}
		if own && slices.ContainsFunc(prefixes, func(p string) bool { return strings.HasPrefix(s.key, p) }) {
			some = append(some, s)
		}
	}
	return some
}

// identify gives commits an author where nobody has, and keeps ssh from asking.
func (s *gitStore) identify(all []setting) {
	if os.Getenv("GIT_SSH") == "" && os.Getenv("GIT_SSH_COMMAND") == "" && last(all, "core.sshcommand") == "" {
		s.env = append(s.env, "GIT_SSH_COMMAND=ssh -o BatchMode=yes")
	}
	for _, role := range []string{"author", "committer"} {
		for field, value := range map[string]string{"name": "budgetcheck", "email": "budgetcheck@localhost"} {
			variable := "GIT_" + strings.ToUpper(role+"_"+field)
			if os.Getenv(variable) == "" && last(all, role+"."+field) == "" && last(all, "user."+field) == "" {
				s.env = append(s.env, variable+"="+value)
			}
		}
	}
}

// password is the secret in an address, "" if there is none.
func password(address string) string {
	u, err := url.Parse(address)
	if err != nil || u.User == nil {
		return ""
	}
	secret, _ := u.User.Password()
	return secret
}
