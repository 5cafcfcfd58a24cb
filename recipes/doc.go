// Package recipes reads the language in which an object is weighed.
package recipes
