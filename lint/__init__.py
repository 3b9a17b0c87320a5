"""Engine, settings, reports, command line and hook: everything that talks to the outside."""

if __name__ == "lint":
    raise ImportError("this folder is installed as overlapse.lint")
