package apitest

import (
	"encoding/json"
	"net/http"
)

// answer is what a request gets. value is filled up to what the description
// promises.
type answer struct {
	status int
	value  any // object, []object or nil
	link   string
	body   []byte
}

// refuse is an answer that says no.
func refuse(status int, why string) answer {
	return answer{status: status, value: object{"message": why, "documentation_url": "https://docs.harbour.example/rest"}}
}

func (a *answer) fill(in *call) (wrong []error) {
	if a.value == nil {
		return nil
	}
	if schema := in.answers(a.status); schema != nil {
		wrong = unknown(schema, a.value)
		a.value = sample(schema, a.value)
	}
	a.body, _ = json.Marshal(a.value)
	return wrong
}

func (a answer) header() http.Header {
	h := http.Header{}
	if a.value != nil {
		h.Set("Content-Type", "application/json; charset=utf-8")
	}
	if a.link != "" {
		h.Set("Link", a.link)
	}
	return h
}

func (a answer) send(w http.ResponseWriter) {
	for key, values := range a.header() {
		w.Header()[key] = values
	}
	if a.body == nil && a.value != nil {
		a.body, _ = json.Marshal(a.value)
	}
	w.WriteHeader(a.status)
	w.Write(a.body)
}
