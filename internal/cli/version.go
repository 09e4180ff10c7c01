package cli

import "runtime/debug"

// version is set by the Makefile from the repository's state.
var version string

// buildVersion says which build this is: what the Makefile said, or what the Go
// command recorded.
func buildVersion() string {
	if version != "" {
		return version
	}
	info, ok := debug.ReadBuildInfo()
	if !ok {
		return "unversioned"
	}
	for _, setting := range info.Settings {
		if setting.Key == "vcs.revision" {
			return setting.Value
		}
	}
	if info.Main.Version == "" {
		return "unversioned"
	}
	return info.Main.Version
}
