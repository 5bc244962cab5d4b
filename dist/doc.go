// Package dist holds the probability laws that comparisons of nested models
// are referred to. See Law for the part every test needs.
package dist
