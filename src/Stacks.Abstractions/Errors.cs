namespace Stacks.Abstractions;

/// <summary>Exit codes of the host, after sysexits.h where it has one for the case.</summary>
public static class ExitCodes
{
    /// <summary>Everything was done.</summary>
    public const int Done = 0;

    /// <summary>An evidence requirement was not met.</summary>
    public const int RequirementNotMet = 1;

    /// <summary>The command line is wrong.</summary>
    public const int Usage = 64;

    /// <summary>Input data are broken or of a kind that is refused.</summary>
    public const int BadInput = 65;

    /// <summary>No such input.</summary>
    public const int NoInput = 66;

    /// <summary>A fault of the program or of a plugin.</summary>
    public const int Internal = 70;

    /// <summary>An output cannot be created.</summary>
    public const int CannotCreate = 73;

    /// <summary>Reading or writing failed.</summary>
    public const int InputOutput = 74;

    /// <summary>Stopped on request; can be resumed.</summary>
    public const int Stopped = 75;

    /// <summary>The recipe is wrong.</summary>
    public const int BadRecipe = 78;
}

/// <summary>
/// An error that a user can cause. The message is one line: where (file, frame, keyword or tag, byte offset), what is
/// wrong, and what to do. It is shown without a stack trace.
/// </summary>
public abstract class StacksException : Exception
{
    /// <summary>An error at a place, with what to do about it.</summary>
    protected StacksException(string where, string what, string remedy, Exception? cause = null)
        : base($"{where}: {what}; {remedy}", cause)
    {
    }

    /// <summary>The exit code that goes with the error; one of <see cref="ExitCodes"/>.</summary>
    public abstract int ExitCode { get; }
}

/// <summary>Input data are broken, hostile, truncated, or of a kind that is refused by name.</summary>
/// <param name="where">File, and frame, keyword, tag or byte offset where known.</param>
/// <param name="what">What is wrong.</param>
/// <param name="remedy">What the user can do.</param>
/// <param name="cause">The underlying error, if any.</param>
public sealed class StackFormatException(string where, string what, string remedy, Exception? cause = null)
    : StacksException(where, what, remedy, cause)
{
    /// <inheritdoc/>
    public override int ExitCode => ExitCodes.BadInput;
}

/// <summary>A recipe is wrong. <c>where</c> is file, line and column, or the step and key.</summary>
/// <param name="where">File, line and column, or step and key.</param>
/// <param name="what">What is wrong.</param>
/// <param name="remedy">What the user can do.</param>
/// <param name="cause">The underlying error, if any.</param>
public sealed class RecipeException(string where, string what, string remedy, Exception? cause = null)
    : StacksException(where, what, remedy, cause)
{
    /// <inheritdoc/>
    public override int ExitCode => ExitCodes.BadRecipe;
}

/// <summary>
/// A parameter value is out of its range or contradicts another. Thrown by <see cref="ParameterSpec"/> and by
/// <see cref="IFilterPlugin.Prepare"/>; the pipeline adds the place in the recipe and rethrows it as a
/// <see cref="RecipeException"/>.
/// </summary>
/// <param name="parameter">Name of the parameter.</param>
/// <param name="what">What is wrong.</param>
/// <param name="remedy">What the user can do.</param>
public sealed class ParameterException(string parameter, string what, string remedy)
    : StacksException(parameter, what, remedy)
{
    /// <summary>Name of the parameter.</summary>
    public string Parameter { get; } = parameter;

    /// <summary>What is wrong.</summary>
    public string What { get; } = what;

    /// <summary>What the user can do.</summary>
    public string Remedy { get; } = remedy;

    /// <inheritdoc/>
    public override int ExitCode => ExitCodes.BadRecipe;
}

/// <summary>A named input does not exist.</summary>
/// <param name="where">The path as given.</param>
/// <param name="what">What is wrong.</param>
/// <param name="remedy">What the user can do.</param>
public sealed class InputMissingException(string where, string what, string remedy)
    : StacksException(where, what, remedy)
{
    /// <inheritdoc/>
    public override int ExitCode => ExitCodes.NoInput;
}

/// <summary>An output cannot be created or would overwrite something.</summary>
/// <param name="where">The path.</param>
/// <param name="what">What is wrong.</param>
/// <param name="remedy">What the user can do.</param>
/// <param name="cause">The underlying error, if any.</param>
public sealed class OutputException(string where, string what, string remedy, Exception? cause = null)
    : StacksException(where, what, remedy, cause)
{
    /// <inheritdoc/>
    public override int ExitCode => ExitCodes.CannotCreate;
}

/// <summary>Reading or writing failed in the operating system.</summary>
/// <param name="where">The path, and the byte offset where known.</param>
/// <param name="what">What is wrong, with the system's error named.</param>
/// <param name="remedy">What the user can do.</param>
/// <param name="cause">The underlying error, if any.</param>
public sealed class StackIOException(string where, string what, string remedy, Exception? cause = null)
    : StacksException(where, what, remedy, cause)
{
    /// <inheritdoc/>
    public override int ExitCode => ExitCodes.InputOutput;
}

/// <summary>A plugin failed in a way it does not declare; the cause is kept for <c>--verbose</c>.</summary>
/// <param name="where">File and frame, and the step.</param>
/// <param name="what">What the plugin did.</param>
/// <param name="remedy">What the user can do.</param>
/// <param name="cause">The plugin's own exception.</param>
public sealed class PluginException(string where, string what, string remedy, Exception? cause = null)
    : StacksException(where, what, remedy, cause)
{
    /// <inheritdoc/>
    public override int ExitCode => ExitCodes.Internal;
}

/// <summary>The command line is wrong.</summary>
/// <param name="where">The argument or option.</param>
/// <param name="what">What is wrong.</param>
/// <param name="remedy">What the user can do.</param>
public sealed class UsageException(string where, string what, string remedy)
    : StacksException(where, what, remedy)
{
    /// <inheritdoc/>
    public override int ExitCode => ExitCodes.Usage;
}
