// Fills the blocks of a process as Nextflow would: read by tests/workflows/nextflow, run by the Groovy in the language
// server's jar. In: a JSON file of cases, each with `text` (Groovy whose last value is a string) and `values`. Out: the
// strings as JSON.
import groovy.json.JsonOutput
import groovy.json.JsonSlurper

// Several files stand in a script with blanks between them. No list of Groovy's, which writes brackets.
class Files {
    List names
    String toString() { names.join(' ') }
    boolean asBoolean() { names }
}

Integer.metaClass.getGB = { -> delegate }
Integer.metaClass.getH = { -> delegate }

def filled = new JsonSlurper().parse(new File(args[0])).collect { given ->
    def values = given.values.collectEntries { name, value -> [name, value instanceof List ? new Files(names: value) : value] }
    new GroovyShell(new Binding(values)).evaluate(given.text).toString()
}
println JsonOutput.toJson(filled)
