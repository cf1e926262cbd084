using System.CommandLine;

namespace Stacks.Cli;

/// <summary><c>inspect STACK...</c>: what a stack is and whether it is whole.</summary>
internal static class InspectVerb
{
    public static Command Build() => new("inspect", "Shows what stacks are and whether they are whole.");
}
