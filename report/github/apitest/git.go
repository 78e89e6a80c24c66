package apitest

import (
	"bytes"
	"encoding/base64"
	"fmt"
	"net/http"
	"os"
	"os/exec"
	"strings"
)

// The host's own bounds on what it answers.
const (
	mostContents = 1 << 20 // of a file's contents; a larger one comes without
	mostTree     = 100_000 // entries of one tree
)

// git asks the repository. ok is false where it has no answer.
func (s *Server) git(args ...string) (out []byte, ok bool) {
	if s.o.Git == "" {
		return nil, false
	}
	cmd := exec.Command("git", append([]string{"-c", "safe.directory=*", "-c", "core.quotePath=false"}, args...)...)
	cmd.Dir = s.o.Git
	cmd.Env = append(os.Environ(), "LC_ALL=C")
	out, err := cmd.Output()
	return out, err == nil
}

func (s *Server) line(args ...string) (string, bool) {
	out, ok := s.git(args...)
	return strings.TrimSpace(string(out)), ok
}

// commit is the id of the commit that a name means, as the host takes names: a
// full id, or a branch.
func (s *Server) commitID(name string) (string, bool) {
	if name == "" {
		name = "HEAD"
	}
	if sha, ok := s.line("rev-parse", "--verify", "--quiet", "refs/heads/"+name+"^{commit}"); ok {
		return sha, true
	}
	return s.line("rev-parse", "--verify", "--quiet", "--end-of-options", name+"^{commit}")
}

func (s *Server) getTree(in *call) answer {
	args := []string{"ls-tree", "-l", "-z", "--full-tree"}
	deep := in.query.Get("recursive") != ""
	if deep {
		args = append(args, "-r", "-t")
	}
	tree, ok := s.line("rev-parse", "--verify", "--quiet", "--end-of-options", in.params["tree_sha"]+"^{tree}")
	if !ok {
		return notFound()
	}
	out, _ := s.git(append(args, tree)...)
	entries := []object{}
	for entry := range strings.SplitSeq(strings.TrimSuffix(string(out), "\x00"), "\x00") {
		if e := treeEntry(entry); e != nil {
			entries = append(entries, e)
		}
	}
	most := mostTree
	if s.o.MostTree > 0 {
		most = s.o.MostTree
	}
	cut := deep && len(entries) > most // whoever asks level by level gets all
	if cut {
		entries = entries[:most]
	}
	return answer{status: http.StatusOK, value: object{"sha": tree, "truncated": cut, "tree": entries}}
}

func treeEntry(text string) object {
	about, path, ok := strings.Cut(text, "\t")
	f := strings.Fields(about)
	if !ok || len(f) != 4 {
		return nil
	}
	e := object{"mode": f[0], "type": f[1], "sha": f[2], "path": path}
	var size int
	if n, _ := fmt.Sscan(f[3], &size); n == 1 {
		e["size"] = size
	}
	return e
}

func (s *Server) getBlob(in *call) answer {
	sha := in.params["file_sha"]
	data, ok := s.git("cat-file", "blob", sha)
	if !ok {
		return notFound()
	}
	return answer{status: http.StatusOK, value: object{"sha": sha, "size": len(data), "encoding": "base64", "content": wrapped(data)}}
}

// wrapped is base64 in lines, as the host sends it.
func wrapped(data []byte) string {
	text := base64.StdEncoding.EncodeToString(data)
	var b bytes.Buffer
	for len(text) > 60 {
		b.WriteString(text[:60] + "\n")
		text = text[60:]
	}
	b.WriteString(text + "\n")
	return b.String()
}

func (s *Server) getBranch(in *call) answer {
	sha, ok := s.line("rev-parse", "--verify", "--quiet", "refs/heads/"+in.params["branch"]+"^{commit}")
	if !ok {
		return notFound()
	}
	return answer{status: http.StatusOK, value: object{"name": in.params["branch"], "commit": s.commitJSON(sha)}}
}

// getRef answers for "heads/main" and "tags/v1".
func (s *Server) getRef(in *call) answer {
	name := "refs/" + in.params["ref"]
	sha, ok := s.line("rev-parse", "--verify", "--quiet", name)
	if !ok {
		return notFound()
	}
	kind, _ := s.line("cat-file", "-t", sha)
	return answer{status: http.StatusOK, value: object{"ref": name, "object": object{"sha": sha, "type": kind}}}
}

func (s *Server) getContents(in *call) answer {
	sha, ok := s.commitID(in.query.Get("ref"))
	if !ok {
		return notFound()
	}
	path := in.params["path"]
	blob, found := s.line("rev-parse", "--verify", "--quiet", sha+":"+path)
	kind, _ := s.line("cat-file", "-t", blob)
	switch {
	case !found:
		return notFound()
	case kind == "tree":
		return s.folder(sha, path)
	}
	data, _ := s.git("cat-file", "blob", blob)
	file := object{"type": "file", "encoding": "base64", "content": wrapped(data), "size": len(data), "sha": blob, "path": path, "name": base(path)}
	if len(data) > mostContents {
		file["encoding"], file["content"] = "none", ""
	}
	return answer{status: http.StatusOK, value: file}
}

func base(path string) string { return path[strings.LastIndex(path, "/")+1:] }

func (s *Server) folder(sha, path string) answer {
	out, _ := s.git("ls-tree", "-l", "-z", "--full-tree", sha, strings.TrimSuffix(path, "/")+"/")
	list := []object{}
	for entry := range strings.SplitSeq(strings.TrimSuffix(string(out), "\x00"), "\x00") {
		e := treeEntry(entry)
		if e == nil {
			continue
		}
		kind := map[string]string{"blob": "file", "tree": "dir", "commit": "submodule"}[e["type"].(string)]
		size, _ := e["size"].(int)
		list = append(list, object{"type": kind, "sha": e["sha"], "path": e["path"], "name": base(e["path"].(string)), "size": size})
	}
	return answer{status: http.StatusOK, value: list}
}
