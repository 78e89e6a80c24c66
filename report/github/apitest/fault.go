package apitest

import (
	"net/http"
	"strings"
)

// Fault makes requests fail. The zero value of each field asks for nothing.
type Fault struct {
	Method string // of the requests; empty: any
	Path   string // part of their path and query; empty: any
	Times  int    // how often it strikes; 0: always
	Skip   int    // requests that pass before it strikes

	Status int               // the answer
	Header map[string]string // of the answer
	Body   string            // of the answer; a plain refusal if empty
	Drop   bool              // close the connection instead of answering
	Done   bool              // only after the request was carried out: the client cannot know
	Before func()            // called first, with nothing locked: to be slow, or to wait for another request
}

// Plant adds a fault. The first that fits a request strikes.
func (s *Server) Plant(f Fault) {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.faults = append(s.faults, &f)
}

// Refuse answers 403 to requests with such a method and path, as the host does
// to a token that lacks a permission.
func (s *Server) Refuse(method, path string) {
	s.Plant(Fault{Method: method, Path: path, Status: http.StatusForbidden})
}

// fault is the fault that strikes a request, if any. One that only waits lets
// the request pass.
func (s *Server) fault(r *http.Request) *Fault {
	f := s.pick(r)
	if f == nil {
		return nil
	}
	if f.Before != nil {
		f.Before()
	}
	if f.Status == 0 && !f.Drop {
		return nil
	}
	return f
}

func (s *Server) pick(r *http.Request) *Fault {
	s.mu.Lock()
	defer s.mu.Unlock()
	for i, f := range s.faults {
		if f.Method != "" && f.Method != r.Method || !strings.Contains(s.below(r), f.Path) {
			continue
		}
		if f.Skip > 0 {
			f.Skip--
			continue
		}
		if f.Times--; f.Times == 0 {
			s.faults = append(s.faults[:i:i], s.faults[i+1:]...)
		}
		return f
	}
	return nil
}

// send is the answer of a fault. What it says is not checked: hosts in trouble
// keep to no description.
func (f *Fault) send(w http.ResponseWriter, r *http.Request) {
	if f.Drop {
		panic(http.ErrAbortHandler)
	}
	for key, value := range f.Header {
		w.Header().Set(key, value)
	}
	if f.Body != "" {
		w.WriteHeader(f.Status)
		w.Write([]byte(f.Body))
		return
	}
	refuse(f.Status, http.StatusText(f.Status)).send(w)
}
