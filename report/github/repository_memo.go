package github

import "sync"

// memo keeps answers by question. A failure is not kept.
type memo[T any] struct {
	mu   sync.Mutex
	kept map[string]*answer[T]
}

type answer[T any] struct {
	mu    sync.Mutex
	known bool
	value T
}

// get asks once, also when several want to know at the same time.
func (m *memo[T]) get(question string, ask func() (T, error)) (T, error) {
	a := m.answer(question)
	a.mu.Lock()
	defer a.mu.Unlock()
	if a.known {
		return a.value, nil
	}
	value, err := ask()
	if err == nil {
		a.known, a.value = true, value
	}
	return value, err
}

func (m *memo[T]) answer(question string) *answer[T] {
	m.mu.Lock()
	defer m.mu.Unlock()
	if m.kept == nil {
		m.kept = map[string]*answer[T]{}
	}
	if m.kept[question] == nil {
		m.kept[question] = &answer[T]{}
	}
	return m.kept[question]
}
