using System.CommandLine;
using System.CommandLine.Parsing;
using Stacks.Pipeline;

namespace Stacks.Cli;

/// <summary>Options that several verbs share.</summary>
internal static class CommonOptions
{
    /// <summary><c>--plugins DIR</c>, any number of times.</summary>
    public static Option<string[]> Plugins() => new("--plugins")
    {
        Description = "a further folder of plugins, or one plugin's own folder; may be given several times",
        HelpName = "DIR",
        Arity = ArgumentArity.OneOrMore,
        DefaultValueFactory = _ => [],
    };

    /// <summary>One or more stacks.</summary>
    public static Argument<string[]> Stacks(string description)
    {
        Argument<string[]> stacks = new("STACK") { Description = description, Arity = ArgumentArity.OneOrMore };
        RefuseOptions(stacks);
        return stacks;
    }

    /// <summary>A misspelt option must not pass as the name of a file.</summary>
    public static void RefuseOptions(Argument argument) => argument.Validators.Add(result =>
    {
        foreach (Token token in result.Tokens.Where(t => t.Value.StartsWith('-')))
            result.AddError($"Unknown option {token.Value} (a file of that name is given as ./{token.Value})");
    });

    /// <summary><c>--json</c>.</summary>
    public static Option<bool> Json() => new("--json") { Description = "write one JSON document to stdout and nothing else" };

    /// <summary>The plugins beside the host and in the named folders.</summary>
    public static PluginCatalogue Catalogue(ParseResult parsed, Option<string[]> plugins) =>
        PluginCatalogue.Load(AppContext.BaseDirectory, parsed.GetValue(plugins) ?? []);

    /// <summary>Does a verb's work; where JSON is asked for, an error becomes a document too, besides its line on stderr.</summary>
    public static int WithJsonErrors(bool json, Func<int> work)
    {
        try
        {
            return work();
        }
        catch (Exception fault) when (json)
        {
            JsonText.Write(new { ExitCode = ExitOrder.CodeOf(fault), Error = ErrorLine.Text(fault) });
            throw;
        }
    }
}
