// Package house holds the tests that keep the house in order: who may import
// whom, what the top level holds, words that must not be in the repository.
package house
