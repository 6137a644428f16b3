--- The version of the library, the only place that says it.

return "0.1.0"
