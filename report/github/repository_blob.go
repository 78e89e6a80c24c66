package github

import (
	"bytes"
	"context"
	"encoding/base64"
	"encoding/json"
	"fmt"
	"io"
	"net/http"

	"github.com/google/go-github/v60/github"

	"budgetcheck/budget/inputs"
)

// maxBlob is the most that is read of one file: a policy or a series, in bytes.
const maxBlob = 50 << 20

// Blob reads a file's content.
func (r *repository) Blob(ctx context.Context, f inputs.File) ([]byte, error) {
	if err := plainID(f.Blob); err != nil {
		return nil, fmt.Errorf("%s: %w", f.Path, err)
	}
	content, err := r.blobs.get(f.Blob, func() ([]byte, error) { return r.blob(ctx, f.Blob) })
	if err != nil {
		return nil, fmt.Errorf("%s: %w", f.Path, err)
	}
	return bytes.Clone(content), nil
}

// blob stops reading where the file is too large, whatever the host sends.
func (r *repository) blob(ctx context.Context, id string) ([]byte, error) {
	req, err := r.host.client.NewRequest(http.MethodGet, fmt.Sprintf("repos/%s/%s/git/blobs/%s", r.host.owner, r.host.repo, id), nil)
	if err != nil {
		return nil, err
	}
	resp, err := r.host.client.BareDo(ctx, req)
	if err != nil {
		return nil, unknown(err)
	}
	defer resp.Body.Close()
	most := r.most/3*4 + r.most/16 + 1<<12 // base64, its line breaks, the other keys
	answer, err := io.ReadAll(io.LimitReader(resp.Body, int64(most)+1))
	if err != nil {
		return nil, fmt.Errorf("the content broke off: %w", err)
	}
	if len(answer) > most {
		return nil, tooLarge(r.most)
	}
	return decodeBlob(answer, r.most)
}

func tooLarge(most int) error {
	return fmt.Errorf("the file has more than %d bytes, the most that is read through the API; judge in a job with a clone", most)
}

func decodeBlob(answer []byte, most int) ([]byte, error) {
	var b github.Blob
	if err := json.Unmarshal(answer, &b); err != nil {
		return nil, fmt.Errorf("the host's answer is not JSON: %w", err)
	}
	if b.GetSize() > most {
		return nil, tooLarge(most)
	}
	if b.GetEncoding() != "base64" {
		return nil, fmt.Errorf("the host sends the content as %s, not as base64", shown(b.GetEncoding()))
	}
	content, err := base64.StdEncoding.DecodeString(b.GetContent()) // it skips line breaks
	if err != nil {
		return nil, fmt.Errorf("the content is not base64: %w", err)
	}
	if b.Size == nil || len(content) != *b.Size {
		return nil, fmt.Errorf("the host sends %d bytes of %d", len(content), b.GetSize())
	}
	return content, nil
}
