package session

//go:generate go run brinkline/kernel/session/internal/gen -dir internal
