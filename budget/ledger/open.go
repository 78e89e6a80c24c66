package ledger

import (
	"context"
	"fmt"
	"net/url"
	"strings"
)

// Open opens the ledger that a URL names: file:PATH, git:[REMOTE#]BRANCH or
// postgres://... .
func Open(ctx context.Context, where string) (Store, error) {
	scheme, rest, _ := strings.Cut(where, ":")
	switch {
	case scheme == "file" && rest != "":
		return openFile(strings.TrimPrefix(rest, "//"))
	case scheme == "git" && rest != "":
		return openGit(ctx, rest)
	case scheme == "postgres" || scheme == "postgresql":
		return openPostgres(ctx, where)
	}
	return nil, fmt.Errorf("%q is no ledger; write file:PATH, git:BRANCH, git:REMOTE#BRANCH or postgres://HOST/DATABASE", redact(where))
}

// redact hides a password, for messages.
func redact(where string) string {
	u, err := url.Parse(where)
	if err != nil {
		return "the URL"
	}
	return u.Redacted()
}
